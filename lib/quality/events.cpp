// SPDX-License-Identifier: Apache-2.0
#include "quality/events.hpp"

#include "quality/event_parts.hpp"

#include "base/text.hpp"

#include <cmath>
#include <functional>

namespace rillstrand::quality {

namespace parts {

double median(std::vector<double> values) {
    values.erase(
        std::remove_if(values.begin(), values.end(), [](double v) { return std::isnan(v); }),
        values.end());
    if (values.empty())
        return missing;
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    return *middle;
}

double robust_sd(const std::vector<double>& values) {
    const double middle = median(values);
    std::vector<double> off;
    off.reserve(values.size());
    for (const double v : values)
        off.push_back(std::abs(v - middle));
    return 1.4826 * median(off);
}

namespace {

/// Neighbouring channels of one fault are one event.
void add_runs(const EventInput& input, const Event& kind,
              const std::function<bool(Eigen::Index)>& is,
              const std::function<double(Eigen::Index)>& size_K,
              const std::function<std::string(Eigen::Index)>& evidence,
              std::vector<Event>& events) {
    const record::Axes& axes = input.source.axes();
    for (Eigen::Index j = 0; j < axes.n_place(); ++j) {
        if (!is(j))
            continue;
        Eigen::Index last = j, largest = j;
        while (last + 1 < axes.n_place() && is(last + 1)) {
            ++last;
            if (std::abs(size_K(last)) > std::abs(size_K(largest)))
                largest = last;
        }
        Event event = kind;
        event.from_m = axes.distance_m(j);
        event.to_m = axes.distance_m(last);
        event.size_K = size_K(largest);
        event.evidence = evidence(largest);
        events.push_back(event);
        j = last;
    }
}

/// Amplitude of the day's wave against that of up to 50 channels on each side in the same stretch.
struct Swing {
    double own_K = missing, usual_K = missing, spread_K = missing;
};

Swing swing_of(const EventInput& input, Eigen::Index j) {
    const Eigen::ArrayXd& all = input.scan.diurnal_amplitude_K;
    const std::string& stretch = input.stretch[static_cast<std::size_t>(j)];
    std::vector<double> around;
    for (Eigen::Index k = std::max<Eigen::Index>(0, j - 50);
         k <= std::min<Eigen::Index>(all.size() - 1, j + 50); ++k)
        if (input.stretch[static_cast<std::size_t>(k)] == stretch)
            around.push_back(all(k));
    if (around.size() < 10)
        return {};
    return {all(j), median(around), robust_sd(around)};
}

std::vector<char> exposed_channels(const EventInput& input) {
    const Eigen::Index n = input.scan.n.size();
    std::vector<char> exposed(static_cast<std::size_t>(n), 0);
    for (Eigen::Index j = 0; j < n; ++j) {
        if (input.setting[static_cast<std::size_t>(j)] != "streambed")
            continue;
        const Swing swing = swing_of(input, j);
        const double over_K = swing.own_K - swing.usual_K;
        const double sd_K = std::hypot(swing.spread_K, input.scan.diurnal_amplitude_sd_K(j));
        if (over_K > std::max({0.3, 0.3 * swing.usual_K, 6.0 * sd_K}))
            exposed[static_cast<std::size_t>(j)] = 1;
    }
    return exposed;
}

} // namespace

void channel_events(const EventInput& input, std::vector<Event>& events) {
    const record::ScanSummary& scan = input.scan;
    const auto none = [](Eigen::Index) { return missing; };
    add_runs(
        input, {"dead", 0, 0, missing, missing, missing, "", "left out"},
        [&](Eigen::Index j) { return scan.n(j) == 0.0; }, none,
        [](Eigen::Index) { return std::string{"no sample at all"}; }, events);
    add_runs(
        input, {"stuck", 0, 0, missing, missing, missing, "", "named, left as it is"},
        [&](Eigen::Index j) { return scan.n(j) >= 10.0 && scan.min_degC(j) == scan.max_degC(j); },
        none,
        [&](Eigen::Index j) { return "always " + text::fixed(scan.mean_degC(j), 2) + " degC"; },
        events);
    const double usual_K = median({scan.noise_K.begin(), scan.noise_K.end()});
    add_runs(
        input, {"noisy", 0, 0, missing, missing, missing, "", "left out of streams"},
        [&](Eigen::Index j) { return scan.noise_K(j) > std::max(0.2, 5.0 * usual_K); },
        [&](Eigen::Index j) { return scan.noise_K(j); },
        [&](Eigen::Index j) {
            return "noise " + text::fixed(scan.noise_K(j), 2) + " K, usually " +
                   text::fixed(usual_K, 3) + " K";
        },
        events);
    const auto exposed = exposed_channels(input);
    add_runs(
        input, {"exposed", 0, 0, missing, missing, missing, "", "named, left as it is"},
        [&](Eigen::Index j) { return exposed[static_cast<std::size_t>(j)] != 0; },
        [&](Eigen::Index j) {
            const Swing swing = swing_of(input, j);
            return swing.own_K - swing.usual_K;
        },
        [&](Eigen::Index j) {
            const Swing swing = swing_of(input, j);
            return "the day's wave has " + text::fixed(swing.own_K, 2) + " K, its neighbours' " +
                   text::fixed(swing.usual_K, 2) + " K";
        },
        events);
}

} // namespace parts

std::vector<Event> find_events(const EventInput& input, Progress& progress) {
    std::vector<Event> events;
    parts::channel_events(input, events);
    parts::splice_events(input, progress, events);
    parts::trace_events(input, progress, events);
    parts::spike_events(input, progress, events);
    return events;
}

} // namespace rillstrand::quality

// SPDX-License-Identifier: Apache-2.0
#include "quality/event_parts.hpp"

#include "base/text.hpp"

#include <cmath>

namespace rillstrand::quality::parts {

namespace {

constexpr Eigen::Index watched_channels = 64;
constexpr std::size_t most_events = 100; ///< of one kind; a count says what was not listed

/// Living channels, evenly spread.
std::vector<Eigen::Index> watched(const record::ScanSummary& scan) {
    std::vector<Eigen::Index> living;
    for (Eigen::Index j = 0; j < scan.n.size(); ++j)
        if (scan.n(j) > 0.5 * scan.n.maxCoeff() && scan.min_degC(j) < scan.max_degC(j))
            living.push_back(j);
    std::vector<Eigen::Index> chosen;
    const auto n = static_cast<Eigen::Index>(living.size());
    const Eigen::Index wanted = std::min(n, watched_channels);
    for (Eigen::Index k = 0; k < wanted; ++k)
        chosen.push_back(living[static_cast<std::size_t>(k * n / wanted)]);
    return chosen;
}

Eigen::ArrayXXf read_columns(const record::Source& source, const std::vector<Eigen::Index>& places,
                             Eigen::Index first, Eigen::Index rows) {
    Eigen::ArrayXXf values(rows, static_cast<Eigen::Index>(places.size()));
    for (std::size_t k = 0; k < places.size(); ++k)
        source.read(record::Quantity::temperature, first, places[k],
                    values.middleCols(static_cast<Eigen::Index>(k), 1));
    return values;
}

/// What each trace did as a whole: the middle change since the one before, its share of channels
/// that moved by about as much, and the share that is missing.
struct Traces {
    std::vector<double> change_K, together, missing_share;
};

double share_together(const std::vector<double>& change, double middle) {
    double n = 0.0, with = 0.0;
    for (const double c : change)
        if (!std::isnan(c)) {
            n += 1.0;
            if (std::abs(c - middle) < 0.5 * std::abs(middle))
                with += 1.0;
        }
    return n > 0.0 ? with / n : 0.0;
}

Traces follow(const EventInput& input, Progress& progress) {
    const auto places = watched(input.scan);
    const Eigen::Index n_time = input.source.axes().n_time();
    const auto size = static_cast<std::size_t>(n_time);
    Traces traces{std::vector<double>(size, missing), std::vector<double>(size, 0.0),
                  std::vector<double>(size, 0.0)};
    if (places.size() < 8)
        return traces;
    const Eigen::Index at_once = std::max<Eigen::Index>(input.source.block_rows(), 1024);
    for (Eigen::Index first = 0; first < n_time; first += at_once) {
        const Eigen::Index before = first > 0 ? 1 : 0;
        const Eigen::Index rows = std::min(at_once, n_time - first) + before;
        const Eigen::ArrayXXf values = read_columns(input.source, places, first - before, rows);
        for (Eigen::Index r = before; r < rows; ++r) {
            const auto i = static_cast<std::size_t>(first - before + r);
            traces.missing_share[i] = static_cast<double>(values.row(r).isNaN().count()) /
                                      static_cast<double>(values.cols());
            if (r == 0)
                continue;
            std::vector<double> change;
            for (Eigen::Index k = 0; k < values.cols(); ++k)
                change.push_back(static_cast<double>(values(r, k) - values(r - 1, k)));
            traces.change_K[i] = median(change);
            traces.together[i] = share_together(change, traces.change_K[i]);
        }
        progress.advance(static_cast<double>(rows * values.cols()) * 1e-6);
    }
    return traces;
}

/// Change against the changes around it, so that the day's course is no jump.
std::vector<double> against_neighbours(const std::vector<double>& change) {
    std::vector<double> unusual(change.size(), missing);
    for (std::size_t i = 1; i < change.size(); ++i) {
        std::vector<double> around;
        for (std::size_t k = i > 4 ? i - 4 : 1; k <= std::min(change.size() - 1, i + 4); ++k)
            if (k != i)
                around.push_back(change[k]);
        unusual[i] = change[i] - median(around);
    }
    return unusual;
}

void jump_events(const record::Axes& axes, const Traces& traces, std::vector<Event>& events) {
    const auto unusual = against_neighbours(traces.change_K);
    const double limit_K = std::max(0.15, 10.0 * robust_sd(unusual));
    const auto jumps = [&](std::size_t i) {
        return std::abs(unusual[i]) > limit_K && traces.together[i] > 0.9;
    };
    std::size_t told = 0;
    for (std::size_t i = 1; i < unusual.size() && told < most_events; ++i) {
        if (!jumps(i))
            continue;
        const double at_s = axes.time_s(static_cast<Eigen::Index>(i));
        const bool back = i + 1 < unusual.size() && jumps(i + 1) &&
                          std::abs(unusual[i] + unusual[i + 1]) < 0.3 * std::abs(unusual[i]);
        events.push_back({back ? "trace" : "jump", missing, missing, at_s, at_s, unusual[i],
                          text::fixed(100.0 * traces.together[i], 0) +
                              " % of the channels change at once by " + text::fixed(unusual[i], 2) +
                              (back ? " K and back" : " K"),
                          "named, left as it is"});
        ++told;
        if (back)
            ++i;
    }
}

void dropout_events(const record::Axes& axes, const Traces& traces, std::vector<Event>& events) {
    const auto& share = traces.missing_share;
    std::size_t told = 0;
    for (std::size_t i = 0; i < share.size() && told < most_events; ++i) {
        if (share[i] <= 0.5)
            continue;
        std::size_t last = i;
        while (last + 1 < share.size() && share[last + 1] > 0.5)
            ++last;
        events.push_back({"dropout", missing, missing, axes.time_s(static_cast<Eigen::Index>(i)),
                          axes.time_s(static_cast<Eigen::Index>(last)), missing,
                          std::to_string(last - i + 1) + " traces miss over half of the channels",
                          "missing samples are left out"});
        ++told;
        i = last;
    }
}

void clock_events(const record::Axes& axes, std::vector<Event>& events) {
    std::vector<double> steps;
    for (Eigen::Index i = 1; i < axes.n_time(); ++i)
        steps.push_back(axes.time_s(i) - axes.time_s(i - 1));
    const double usual_s = median(steps);
    if (!(usual_s > 0.0) || robust_sd(steps) > 0.02 * usual_s)
        return;
    std::size_t told = 0;
    for (std::size_t i = 0; i < steps.size() && told < most_events; ++i) {
        const double over_s = steps[i] - std::round(steps[i] / usual_s) * usual_s;
        if (std::abs(over_s) <= 0.15 * usual_s)
            continue;
        const auto row = static_cast<Eigen::Index>(i);
        events.push_back({"clock", missing, missing, axes.time_s(row), axes.time_s(row + 1),
                          missing,
                          "a step of " + text::number(steps[i]) + " s where traces come every " +
                              text::number(usual_s) + " s",
                          "times are left as they are"});
        ++told;
    }
}

} // namespace

void trace_events(const EventInput& input, Progress& progress, std::vector<Event>& events) {
    const record::Axes& axes = input.source.axes();
    clock_events(axes, events);
    if (axes.n_time() < 10)
        return;
    progress.stage("looking for faults of traces",
                   static_cast<double>(axes.n_time() * watched_channels) * 1e-6, "million samples");
    const Traces traces = follow(input, progress);
    dropout_events(axes, traces, events);
    jump_events(axes, traces, events);
}

} // namespace rillstrand::quality::parts

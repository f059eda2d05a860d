// SPDX-License-Identifier: Apache-2.0
#include "quality/event_parts.hpp"

#include "base/text.hpp"
#include "record/bin.hpp"

#include <cmath>

namespace rillstrand::quality::parts {

namespace {

constexpr double largest_contrast_K = 15.0;

/// Right minus left of a place, through time.
Eigen::ArrayXd across(const Eigen::ArrayXXd& values, Eigen::Index j, Eigen::Index gap,
                      Eigen::Index width) {
    return values.middleCols(j + 1 + gap, width).rowwise().mean() -
           values.middleCols(j - gap - width + 1, width).rowwise().mean();
}

struct Step {
    double mean_K = missing; ///< at the water's mean temperature
    double slope = missing;  ///< K of step for each K of water
    double slope_sd = missing;
};

/// Straight line of a step against the water; times with a missing value are left out.
Step step_against_water(const Eigen::ArrayXd& step_K, const Eigen::ArrayXd& water_degC) {
    const auto good = (step_K + water_degC).isFinite();
    const auto n = static_cast<double>(good.count());
    if (n < 12.0)
        return {};
    const double water = good.select(water_degC, 0.0).sum() / n;
    const double mean = good.select(step_K, 0.0).sum() / n;
    const Eigen::ArrayXd w = good.select(water_degC - water, 0.0);
    const Eigen::ArrayXd d = good.select(step_K - mean, 0.0);
    const double ww = w.square().sum();
    if (!(ww > 0.0))
        return {};
    const double slope = (w * d).sum() / ww;
    const Eigen::ArrayXd left = d - slope * w;
    const double var = left.square().sum() / (n - 2.0);
    const Eigen::Index m = left.size() - 1;
    const double along =
        std::clamp((left.head(m) * left.tail(m)).sum() / left.square().sum(), 0.0, 0.95);
    return {mean, slope, std::sqrt(var / ww * (1.0 + along) / (1.0 - along))};
}

/// A step that no inflow of believable contrast explains.
bool is_constant(const Step& step) {
    return std::abs(step.slope) + 2.0 * step.slope_sd < std::abs(step.mean_K) / largest_contrast_K;
}

struct Reach {
    Eigen::Index first = 0, count = 0;
};

std::vector<Reach> streambed_reaches(const EventInput& input) {
    std::vector<Reach> reaches;
    const auto n = static_cast<Eigen::Index>(input.setting.size());
    const auto same = [&](Eigen::Index a, Eigen::Index b) {
        return input.setting[static_cast<std::size_t>(b)] == "streambed" &&
               input.stretch[static_cast<std::size_t>(a)] ==
                   input.stretch[static_cast<std::size_t>(b)];
    };
    for (Eigen::Index j = 0; j < n; ++j) {
        if (!same(j, j))
            continue;
        Eigen::Index last = j;
        while (last + 1 < n && same(j, last + 1))
            ++last;
        reaches.push_back({j, last - j + 1});
        j = last;
    }
    return reaches;
}

void splices_of(const EventInput& input, const Reach& reach, double bin_s, Progress& progress,
                std::vector<Event>& events) {
    const record::Axes& axes = input.source.axes();
    const double spacing_m =
        (axes.distance_m(reach.first + reach.count - 1) - axes.distance_m(reach.first)) /
        static_cast<double>(reach.count - 1);
    const auto gap =
        static_cast<Eigen::Index>(std::ceil(0.75 * input.spatial_response_m / spacing_m));
    const auto width = std::max<Eigen::Index>(
        4, static_cast<Eigen::Index>(std::ceil(4.0 * input.spatial_response_m / spacing_m)));
    const Eigen::Index margin = gap + width;
    if (reach.count < 4 * margin)
        return;
    const auto binned = record::bin(input.source, {reach.first, reach.count}, bin_s, progress);
    const Eigen::ArrayXXd values = binned.mean_degC.cast<double>();
    const Eigen::ArrayXd water = values.rowwise().mean();
    std::vector<double> size(static_cast<std::size_t>(reach.count), missing);
    for (Eigen::Index j = margin; j + margin < reach.count; ++j)
        size[static_cast<std::size_t>(j)] = across(values, j, gap, width).mean();
    const double limit_K = std::max(0.1, 8.0 * robust_sd(size));
    for (Eigen::Index j = margin; j + margin < reach.count; ++j) {
        const double here = std::abs(size[static_cast<std::size_t>(j)]);
        bool largest = here > limit_K;
        for (Eigen::Index k = std::max(margin, j - margin);
             largest && k <= std::min(reach.count - margin - 1, j + margin); ++k)
            if (k != j && std::abs(size[static_cast<std::size_t>(k)]) > here)
                largest = false;
        if (!largest)
            continue;
        const Step step = step_against_water(across(values, j, gap, width), water);
        if (!is_constant(step))
            continue;
        const double at_m = 0.5 * (binned.distance_m(j) + binned.distance_m(j + 1));
        events.push_back({"splice", at_m - 0.5 * input.spatial_response_m,
                          at_m + 0.5 * input.spatial_response_m, missing, missing, step.mean_K,
                          "a step of " + text::fixed(step.mean_K, 2) + " K that changes by " +
                              text::fixed(step.slope, 4) + " K (sd " +
                              text::fixed(step.slope_sd, 4) + ") for each kelvin of the water",
                          "named, left as it is"});
    }
}

/// Off the mean of its two neighbours in time.
float off_in_time(const Eigen::ArrayXXf& block, Eigen::Index r, Eigen::Index j) {
    return block(r, j) - 0.5F * (block(r - 1, j) + block(r + 1, j));
}

} // namespace

void splice_events(const EventInput& input, Progress& progress, std::vector<Event>& events) {
    const record::Axes& axes = input.source.axes();
    if (axes.n_time() < 24)
        return;
    for (const Reach& reach : streambed_reaches(input)) {
        if (reach.count < 10)
            continue;
        const double span_s = axes.time_s(axes.n_time() - 1) - axes.time_s(0);
        const double bin_s =
            record::choose_bin_s(axes, reach.count, std::max(900.0, span_s / 300.0), 100e6);
        splices_of(input, reach, bin_s, progress, events);
    }
}

void spike_events(const EventInput& input, Progress& progress, std::vector<Event>& events) {
    const record::Axes& axes = input.source.axes();
    if (axes.n_place() < 3)
        return;
    progress.stage("looking for spikes",
                   static_cast<double>(axes.n_time()) * static_cast<double>(axes.n_place()) * 1e-6,
                   "million samples");
    constexpr std::size_t most_events = 100;
    std::vector<Event> found;
    std::size_t more = 0;
    const Eigen::Index wide = 256;
    const Eigen::Index tall = std::max<Eigen::Index>(input.source.block_rows(), 1024);
    for (Eigen::Index place = 0; place + 2 < axes.n_place(); place += wide - 2)
        for (Eigen::Index time = 0; time + 2 < axes.n_time(); time += tall - 2) {
            Eigen::ArrayXXf block(std::min(tall, axes.n_time() - time),
                                  std::min(wide, axes.n_place() - place));
            input.source.read(record::Quantity::temperature, time, place, block);
            for (Eigen::Index j = 1; j + 1 < block.cols(); ++j) {
                // sd of a sample less the mean of two others is sqrt 1.5 of one sample's.
                const auto limit = static_cast<float>(
                    std::max(0.5, 12.0 * 1.2247 * input.scan.noise_K(place + j)));
                for (Eigen::Index r = 1; r + 1 < block.rows(); ++r) {
                    const float off = off_in_time(block, r, j);
                    if (!(std::abs(off) > limit) ||
                        !(std::abs(off_in_time(block, r, j - 1)) < 0.5F * std::abs(off)) ||
                        !(std::abs(off_in_time(block, r, j + 1)) < 0.5F * std::abs(off)) ||
                        !(std::abs(block(r, j) - block(r - 1, j)) > 0.9F * std::abs(off)))
                        continue;
                    if (!(std::abs(block(r + 1, j) - block(r - 1, j)) < 0.3F * std::abs(off)))
                        continue;
                    if (found.size() == most_events) {
                        ++more;
                        continue;
                    }
                    const double at_m = axes.distance_m(place + j);
                    const double at_s = axes.time_s(time + r);
                    found.push_back({"spike", at_m, at_m, at_s, at_s, static_cast<double>(off),
                                     text::fixed(static_cast<double>(off), 2) +
                                         " K off the samples before and after",
                                     "named, left as it is"});
                }
            }
            progress.advance(static_cast<double>(block.size()) * 1e-6);
        }
    if (more > 0)
        found.back().evidence += "; " + std::to_string(more) + " more are not listed";
    events.insert(events.end(), found.begin(), found.end());
}

} // namespace rillstrand::quality::parts

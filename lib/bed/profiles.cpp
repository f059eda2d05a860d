// SPDX-License-Identifier: Apache-2.0
#include "bed/profiles.hpp"

#include "bed/depths.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::bed {

namespace {

using Eigen::ArrayXd;
using Eigen::Index;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Deeper than this a daily wave leaves nothing and slower changes tell little within weeks.
constexpr double reach_m = 1.0;

double spread_K(const ArrayXd& values) {
    double n = 0.0, sum = 0.0, square = 0.0;
    for (const double v : values)
        if (!std::isnan(v)) {
            n += 1.0;
            sum += v;
            square += v * v;
        }
    return n < 2.0 ? 0.0 : std::sqrt(std::max(0.0, square / n - sum * sum / n / n));
}

/// Leaves out places whose fibre reaches out of the bed, if enough is left that still moves.
void drop_straddling(std::vector<Place>& places, const BedInput& input, double half_m) {
    std::vector<Place*> wholly;
    for (Place& p : places)
        if (p.use == Use::fitted && p.depth_m >= half_m)
            wholly.push_back(&p);
    if (wholly.size() < 4)
        return;
    // Water that comes up fast keeps all change near the surface: then these places say most.
    const Place& third = *wholly[2];
    if (spread_K(input.temperature_degC.col(third.column)) < 5.0 * third.noise_K)
        return;
    for (Place& p : places)
        if (p.use == Use::fitted && p.depth_m < half_m)
            p.use = Use::straddles_surface;
}

/// Where the rod stands in mixed water, that water is the best upper boundary: then what averages
/// over water and bed is modelled so.
bool take_water(std::vector<Place>& places, const BedInput& input, double height_m) {
    std::vector<Place*> water;
    std::size_t in_bed = 0;
    for (Place& p : places) {
        if (p.use == Use::above_bed && p.depth_m < -0.95 * height_m &&
            p.depth_m > -0.95 * height_m - 0.15 && std::isfinite(p.noise_K))
            water.push_back(&p);
        in_bed += p.use == Use::fitted ? 1U : 0U;
    }
    if (water.empty() || in_bed < 3)
        return false;
    // Channels in air or in the sun part from one another; mixed water does not.
    const ArrayXd nearest = input.temperature_degC.col(water.back()->column);
    std::vector<Place*> alike;
    for (Place* p : water) {
        const ArrayXd apart = input.temperature_degC.col(p->column) - nearest;
        const double allowed =
            2.0 * std::hypot(p->noise_K, water.back()->noise_K) + 0.03 * spread_K(nearest);
        if (apart.isFinite().any() && spread_K(apart) < allowed)
            alike.push_back(p);
    }
    const double own = static_cast<double>(nearest.isFinite().count());
    if (own < 0.5 * static_cast<double>(nearest.size()))
        return false;
    for (Place* p : alike)
        p->use = Use::water;
    for (Place& p : places)
        if (p.use == Use::above_bed && p.depth_m > -0.5 * height_m)
            p.use = Use::fitted;
    return true;
}

void drop_deep(std::vector<Place>& places, double step_s) {
    if (step_s > 3.0 * 3600.0)
        return;
    double top = nan;
    std::size_t within = 0;
    for (const Place& p : places)
        if (p.use == Use::fitted) {
            top = std::isnan(top) ? p.depth_m : top;
            within += p.depth_m <= top + reach_m ? 1U : 0U;
        }
    if (within < 4)
        return;
    for (Place& p : places)
        if (p.use == Use::fitted && p.depth_m > top + reach_m)
            p.use = Use::too_deep;
}

} // namespace

std::string to_string(Use use) {
    switch (use) {
    case Use::fitted:
        return "fitted";
    case Use::boundary:
        return "boundary";
    case Use::water:
        return "water above the bed";
    case Use::above_bed:
        return "above the bed";
    case Use::straddles_surface:
        return "averages over water and bed";
    case Use::too_deep:
        return "below the reach of daily change";
    case Use::too_few_samples:
        return "too few samples";
    case Use::noisy:
        return "too noisy";
    }
    return {};
}

std::vector<Place> sort_places(const BedInput& input) {
    const ArrayXd depth_m = depths_m(input.config, input.fibre_m);
    std::vector<Place> places;
    std::vector<double> noise;
    for (Index j = 0; j < depth_m.size(); ++j) {
        const ArrayXd values = input.temperature_degC.col(j);
        Place p{j, input.fibre_m(j), depth_m(j),
                white_noise_K(input.time_s, values, input.interval_s), Use::fitted};
        const auto n = static_cast<double>(values.isFinite().count());
        // A millimetre: channels at the datum itself are at the surface.
        if (p.depth_m < -1e-3)
            p.use = Use::above_bed;
        else if (n < 0.5 * static_cast<double>(values.size()) || std::isnan(p.noise_K))
            p.use = Use::too_few_samples;
        else
            noise.push_back(p.noise_K);
        places.push_back(p);
    }
    std::sort(places.begin(), places.end(),
              [](const Place& a, const Place& b) { return a.depth_m < b.depth_m; });
    if (noise.size() > 3) {
        std::nth_element(noise.begin(),
                         noise.begin() + static_cast<std::ptrdiff_t>(noise.size() / 4),
                         noise.end());
        const double usual = noise[noise.size() / 4];
        for (Place& p : places)
            if (p.use == Use::fitted && p.noise_K > 8.0 * usual && p.noise_K > 0.2)
                p.use = Use::noisy;
    }
    const double height_m = averaging_height_m(input);
    if (height_m > 0.0 && !take_water(places, input, height_m))
        drop_straddling(places, input, 0.5 * height_m);
    drop_deep(places, input.interval_s);
    Place *first = nullptr, *last = nullptr;
    for (Place& p : places)
        if (p.use == Use::fitted) {
            first = first == nullptr ? &p : first;
            last = &p;
        }
    const bool has_water = std::any_of(places.begin(), places.end(),
                                       [](const Place& p) { return p.use == Use::water; });
    if (first != nullptr) {
        last->use = Use::boundary;
        if (!has_water)
            first->use = Use::boundary;
    }
    return places;
}

double averaging_height_m(const BedInput& input) {
    return input.config.winding ? input.spatial_response_m / fibre_per_height(input.config.winding)
                                : 0.0;
}

std::vector<Place> used(const std::vector<Place>& places) {
    std::vector<Place> result;
    for (const Place& p : places)
        if (p.use == Use::fitted || p.use == Use::boundary || p.use == Use::water)
            result.push_back(p);
    return result;
}

namespace {

/// Fills short gaps in a boundary by straight lines.
void bridge_in_place(Eigen::Ref<ArrayXd> values, Index most) {
    Index last = -1;
    for (Index i = 0; i < values.size(); ++i) {
        if (std::isnan(values(i)))
            continue;
        if (last >= 0 && i - last > 1 && i - last - 1 <= most)
            for (Index k = last + 1; k < i; ++k)
                values(k) = values(last) + (values(i) - values(last)) *
                                               static_cast<double>(k - last) /
                                               static_cast<double>(i - last);
        last = i;
    }
}

} // namespace

Profile cut_profile(const BedInput& input, const std::vector<Place>& chosen, double from_s,
                    double to_s, double min_s) {
    Profile p;
    p.step_s = input.interval_s;
    // An even axis of time: rows that the record lacks are missing.
    std::vector<Index> source;
    const Index n_input = input.time_s.size();
    Index first = 0;
    while (first < n_input && input.time_s(first) < from_s)
        ++first;
    Index end = first;
    while (end < n_input && input.time_s(end) < to_s)
        ++end;
    if (end - first < 2)
        return p;
    const double begin_s = input.time_s(first);
    const auto rows =
        static_cast<Index>(std::lround((input.time_s(end - 1) - begin_s) / p.step_s)) + 1;
    Index n_water = 0;
    while (n_water < static_cast<Index>(chosen.size()) &&
           chosen[static_cast<std::size_t>(n_water)].use == Use::water)
        ++n_water;
    // The upper boundary, the places between, the lower boundary.
    const auto n_top = std::max<Index>(1, n_water);
    const Index n = static_cast<Index>(chosen.size()) - n_top - 1;
    p.time_s = begin_s + p.step_s * ArrayXd::LinSpaced(rows, 0.0, static_cast<double>(rows - 1));
    p.top_degC = p.bottom_degC = ArrayXd::Constant(rows, nan);
    p.observed_degC = Eigen::ArrayXXd::Constant(rows, n, nan);
    for (Index i = first; i < end; ++i) {
        const auto row = static_cast<Index>(std::lround((input.time_s(i) - begin_s) / p.step_s));
        const auto value = [&](Index j) {
            return input.temperature_degC(i, chosen[static_cast<std::size_t>(j)].column);
        };
        double sum = 0.0, count = 0.0;
        for (Index j = 0; j < n_top; ++j)
            if (!std::isnan(value(j))) {
                sum += value(j);
                count += 1.0;
            }
        p.top_degC(row) = count > 0.0 ? sum / count : nan;
        for (Index j = 0; j < n; ++j)
            p.observed_degC(row, j) = value(n_top + j);
        p.bottom_degC(row) = value(n_top + n);
    }
    const Index most = std::max<Index>(2, static_cast<Index>(7200.0 / p.step_s));
    bridge_in_place(p.top_degC, most);
    bridge_in_place(p.bottom_degC, most);
    p.top_m = n_water > 0 ? 0.0 : chosen.front().depth_m;
    p.bottom_m = chosen.back().depth_m;
    p.averaging_m = n_water > 0 ? averaging_height_m(input) : 0.0;
    p.depth_m.resize(n);
    for (Index j = 0; j < n; ++j)
        p.depth_m(j) = chosen[static_cast<std::size_t>(n_top + j)].depth_m;
    const double gap_m = (p.bottom_m - p.top_m) / static_cast<double>(n + 1);
    const double height_m = averaging_height_m(input);
    p.settle_s = 0.5 * (gap_m * gap_m + height_m * height_m) * input.config.heat_capacity_jm3k /
                 input.config.thermal_conductivity_wmk;
    const auto least = std::max<Index>(8, static_cast<Index>(min_s / p.step_s));
    for (Index i = 0; i < rows;) {
        Index k = i;
        while (k < rows && std::isfinite(p.top_degC(k)) && std::isfinite(p.bottom_degC(k)))
            ++k;
        if (k - i >= least)
            p.segments.push_back({i, k - i});
        i = std::max(k, i + 1);
    }
    return p;
}

} // namespace rillstrand::bed

// SPDX-License-Identifier: Apache-2.0
#include "bed/pairs.hpp"

#include "heat/vertical_flow.hpp"

#include <array>
#include <cmath>
#include <functional>
#include <limits>

namespace rillstrand::bed {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double pi = 3.14159265358979323846;

/// What a pair's flux depends on, in the order of the sd beside it.
struct Known {
    double log_ratio = 0.0, lag_rad = 0.0;
    double conductivity = 0.0, capacity = 0.0, spacing_m = 0.0;
};
using Deviations = std::array<double, 5>;

/// Root of the summed squares of what each deviation changes.
double propagated(const std::function<double(const Known&)>& f, const Known& at,
                  const Deviations& sd) {
    double sum = 0.0;
    for (std::size_t k = 0; k < sd.size(); ++k) {
        const auto moved = [&](double by) {
            Known m = at;
            const std::array<double*, 5> parts{&m.log_ratio, &m.lag_rad, &m.conductivity,
                                               &m.capacity, &m.spacing_m};
            *parts[k] += by;
            return f(m);
        };
        const double up = moved(sd[k]), down = moved(-sd[k]);
        // Where one side has no solution, the other counts for both;
        // where neither has, the value is as unsure as it is large.
        double half = 0.5 * (up - down);
        if (std::isnan(up))
            half = std::isnan(down) ? f(at) : f(at) - down;
        else if (std::isnan(down))
            half = up - f(at);
        sum += half * half;
    }
    return std::sqrt(sum);
}

} // namespace

bool plausible_diffusivity(double diffusivity_m2_s) {
    const double m2_d = diffusivity_m2_s * 86400.0;
    return m2_d >= 0.028 && m2_d <= 0.180;
}

Pair choose_pair(const std::vector<Place>& places, const std::vector<Harmonic>& waves,
                 double height_m) {
    Pair best;
    double least = std::numeric_limits<double>::infinity();
    for (std::size_t i = 0; i < places.size(); ++i) {
        if (places[i].use == Use::water || places[i].depth_m < 0.5 * height_m ||
            std::isnan(waves[i].amplitude))
            continue;
        if (best.upper == nullptr) {
            best.upper = &places[i];
            best.above = waves[i];
            continue;
        }
        const Harmonic& w = waves[i];
        if (w.amplitude < 5.0 * w.amplitude_sd ||
            best.above.amplitude < 5.0 * best.above.amplitude_sd)
            continue;
        const double spacing = places[i].depth_m - best.upper->depth_m;
        const double per_depth = std::hypot(w.amplitude_sd / w.amplitude,
                                            best.above.amplitude_sd / best.above.amplitude) /
                                 spacing;
        if (per_depth < least) {
            least = per_depth;
            best.lower = &places[i];
            best.below = w;
        }
    }
    return best;
}

std::vector<FluxRow> pair_fluxes(const Pair& pair, const campaign::Bed& stated,
                                 const Trust& trust) {
    using heat::day_s;
    const Harmonic &a = pair.above, &b = pair.below;
    double lag = std::fmod(b.phase_rad - a.phase_rad, 2.0 * pi);
    if (lag < -0.5 * pi)
        lag += 2.0 * pi;
    const Known at{std::log(b.amplitude / a.amplitude), lag, stated.thermal_conductivity_wmk,
                   stated.heat_capacity_jm3k, pair.lower->depth_m - pair.upper->depth_m};
    const Deviations sd{std::hypot(a.amplitude_sd / a.amplitude, b.amplitude_sd / b.amplitude),
                        std::hypot(a.phase_sd_rad, b.phase_sd_rad),
                        at.conductivity * std::hypot(trust.conductivity, trust.conductivity_layer),
                        at.capacity * std::hypot(trust.capacity, trust.capacity_layer),
                        at.spacing_m * trust.depth_scale};
    const auto damping = [](const Known& k) {
        return heat::Damping{std::exp(k.log_ratio), k.lag_rad};
    };
    const auto by_both = [&](const Known& k) {
        return heat::flux_of_front_m_s(
            heat::front_from_both(day_s, k.spacing_m, damping(k)).front_m_s, k.capacity);
    };
    const auto diffusivity = [&](const Known& k) {
        return heat::front_from_both(day_s, k.spacing_m, damping(k)).diffusivity_m2_s;
    };
    const auto by_amplitude = [&](const Known& k) {
        return heat::flux_of_front_m_s(heat::front_from_amplitude_m_s(k.conductivity / k.capacity,
                                                                      day_s, k.spacing_m,
                                                                      std::exp(k.log_ratio)),
                                       k.capacity);
    };
    const auto by_phase = [&](const Known& k) {
        return heat::flux_of_front_m_s(heat::front_speed_from_lag_m_s(k.conductivity / k.capacity,
                                                                      day_s, k.spacing_m,
                                                                      k.lag_rad),
                                       k.capacity);
    };
    FluxRow row;
    row.upper_m = pair.upper->depth_m;
    row.lower_m = pair.lower->depth_m;
    std::vector<FluxRow> rows;
    const auto add = [&](const char* method, const std::function<double(const Known&)>& f) {
        row.method = method;
        row.flux_m_s = f(at);
        row.flux_sd_m_s = std::isnan(row.flux_m_s) ? nan : propagated(f, at, sd);
        row.diffusivity_m2_s = row.diffusivity_sd_m2_s = nan;
        row.flag.clear();
        rows.push_back(row);
    };
    add("joint", by_both);
    rows.back().diffusivity_m2_s = diffusivity(at);
    rows.back().diffusivity_sd_m2_s = propagated(diffusivity, at, sd);
    if (std::isfinite(rows.back().diffusivity_m2_s) &&
        !plausible_diffusivity(rows.back().diffusivity_m2_s)) {
        rows.back().flux_m_s = rows.back().flux_sd_m_s = nan;
        rows.back().flag = "bed-diffusivity";
    }
    add("amplitude", by_amplitude);
    add("phase", by_phase);
    return rows;
}

} // namespace rillstrand::bed

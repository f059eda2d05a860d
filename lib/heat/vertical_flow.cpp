// SPDX-License-Identifier: Apache-2.0
#include "heat/vertical_flow.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <cmath>
#include <limits>

namespace rillstrand::heat {

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
/// Fronts beyond this are past what daily waves can tell: some 20 m/d of flux.
constexpr double fastest_m_s = 4e-4;

/// The root of an increasing or decreasing function between two ends, by halving; NaN if none.
template <class F> double root(const F& f, double low, double high) {
    double at_low = f(low);
    if (at_low * f(high) > 0.0)
        return nan;
    for (int i = 0; i < 200 && high - low > 1e-16; ++i) {
        const double middle = 0.5 * (low + high);
        const double at_middle = f(middle);
        if (at_low * at_middle <= 0.0) {
            high = middle;
        } else {
            low = middle;
            at_low = at_middle;
        }
    }
    return 0.5 * (low + high);
}

} // namespace

WaveNumbers wave_numbers(double diffusivity_m2_s, double front_m_s, double period_s) {
    if (!(diffusivity_m2_s > 0.0) || !(period_s > 0.0))
        throw DataError("a wave in the ground needs a diffusivity and a period above 0, not " +
                        text::number(diffusivity_m2_s) + " m2/s and " + text::number(period_s) +
                        " s");
    const double v2 = front_m_s * front_m_s;
    const double w = 8.0 * pi * diffusivity_m2_s / period_s;
    const double alpha = std::sqrt(v2 * v2 + w * w);
    // alpha - v^2 without the loss of digits that the plain difference has where v is large.
    const double less = w * w / (alpha + v2);
    const double grown = std::sqrt(0.5 * (alpha + v2));
    // Where water goes down, grown - v is a small difference: (grown^2 - v^2) / (grown + v).
    const double a = front_m_s > 0.0 ? 0.5 * less / (grown + front_m_s) : grown - front_m_s;
    return {a / (2.0 * diffusivity_m2_s), std::sqrt(0.5 * less) / (2.0 * diffusivity_m2_s)};
}

Damping damping(double diffusivity_m2_s, double front_m_s, double period_s, double spacing_m) {
    const WaveNumbers n = wave_numbers(diffusivity_m2_s, front_m_s, period_s);
    return {std::exp(-n.decay_per_m * spacing_m), n.turn_rad_m * spacing_m};
}

double front_from_amplitude_m_s(double diffusivity_m2_s, double period_s, double spacing_m,
                                double amplitude_ratio) {
    if (!(amplitude_ratio > 0.0) || !(spacing_m > 0.0))
        return nan;
    const double decay_per_m = -std::log(amplitude_ratio) / spacing_m;
    return root(
        [&](double v) {
            return wave_numbers(diffusivity_m2_s, v, period_s).decay_per_m - decay_per_m;
        },
        -fastest_m_s, fastest_m_s);
}

double front_speed_from_lag_m_s(double diffusivity_m2_s, double period_s, double spacing_m,
                                double lag_rad) {
    if (!(lag_rad > 0.0) || !(spacing_m > 0.0))
        return nan;
    const double turn_rad_m = lag_rad / spacing_m;
    return root(
        [&](double v) {
            return wave_numbers(diffusivity_m2_s, v, period_s).turn_rad_m - turn_rad_m;
        },
        0.0, fastest_m_s);
}

JointFront front_from_both(double period_s, double spacing_m, Damping seen) {
    if (!(seen.amplitude_ratio > 0.0 && seen.amplitude_ratio < 1.0 && seen.lag_rad > 0.0))
        return {nan, nan};
    const double omega = 2.0 * pi / period_s;
    const double eta = -std::log(seen.amplitude_ratio) / seen.lag_rad;
    const double e2 = eta * eta;
    return {omega * spacing_m / seen.lag_rad * (1.0 - e2) / (1.0 + e2),
            omega * spacing_m * spacing_m * eta / (seen.lag_rad * seen.lag_rad * (1.0 + e2))};
}

double spacing_from_both_m(double diffusivity_m2_s, double period_s, Damping seen) {
    if (!(seen.amplitude_ratio > 0.0 && seen.amplitude_ratio < 1.0 && seen.lag_rad > 0.0))
        return nan;
    const double omega = 2.0 * pi / period_s;
    const double eta = -std::log(seen.amplitude_ratio) / seen.lag_rad;
    return seen.lag_rad * std::sqrt(diffusivity_m2_s / omega * (eta + 1.0 / eta));
}

double steady_share(double beta, double x) {
    if (std::abs(beta) < 1e-9)
        return x;
    // From the end where the exponent is negative, so that nothing overflows.
    if (beta > 0.0)
        return (std::exp(beta * (x - 1.0)) - std::exp(-beta)) / -std::expm1(-beta);
    return std::expm1(beta * x) / std::expm1(beta);
}

double flux_of_beta_m_s(double beta, double conductivity_W_m_K, double length_m) {
    return beta * conductivity_W_m_K / (water_heat_capacity_J_m3_K * length_m);
}

double flux_above_deep_water_m_s(double conductivity_W_m_K, double depth_m, double top_degC,
                                 double at_depth_degC, double deep_degC) {
    const double left = (at_depth_degC - deep_degC) / (top_degC - deep_degC);
    if (!(left > 0.0 && left < 1.0) || !(depth_m > 0.0))
        return nan;
    return conductivity_W_m_K / (water_heat_capacity_J_m3_K * depth_m) * std::log(left);
}

} // namespace rillstrand::heat

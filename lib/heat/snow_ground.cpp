// SPDX-License-Identifier: Apache-2.0
#include "heat/snow_ground.hpp"

#include <cmath>
#include <limits>
#include <numbers>

namespace rillstrand::heat {

namespace {
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double day_s = 86400.0;
} // namespace

double snow_conductivity_W_m_K(double density_kg_m3) {
    const double rho = density_kg_m3 / 1000.0;
    if (!(rho > 0.0) || rho > 0.6)
        return nan;
    return rho < 0.156 ? 0.023 + 0.234 * rho : 0.138 - 1.01 * rho + 3.233 * rho * rho;
}

double damping_depth_m(double diffusivity_m2_s, double period_s) {
    return std::sqrt(diffusivity_m2_s * period_s / std::numbers::pi);
}

double snow_damping_depth_m(double density_kg_m3) {
    return damping_depth_m(
        snow_conductivity_W_m_K(density_kg_m3) / (density_kg_m3 * snow_heat_J_kg_K), day_s);
}

double diffusivity_from_amplitudes_m2_s(double shallow_K, double deep_K, double apart_m,
                                        double period_s) {
    if (!(deep_K > 0.0) || !(shallow_K > deep_K))
        return nan;
    const double ratio = std::log(shallow_K / deep_K);
    return std::numbers::pi * apart_m * apart_m / (period_s * ratio * ratio);
}

double diffusivity_from_lag_m2_s(double lag_s, double apart_m, double period_s) {
    if (!(lag_s > 0.0))
        return nan;
    return apart_m * apart_m * period_s / (4.0 * std::numbers::pi * lag_s * lag_s);
}

double depth_from_damping_m(double share, double density_kg_m3) {
    if (!(share > 0.0) || share > 1.0)
        return nan;
    return snow_damping_depth_m(density_kg_m3) * std::log(1.0 / share);
}

} // namespace rillstrand::heat

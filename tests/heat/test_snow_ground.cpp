// SPDX-License-Identifier: Apache-2.0
#include "heat/snow_ground.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;

namespace {
constexpr double day_s = 86400.0, year_s = 365.25 * day_s;
} // namespace

// Sturm et al. (1997), J. Glaciol. 43, 26-41: both branches of the quadratic fit.
TEST_CASE("conductivity of snow follows the published fit", "[heat][published]") {
    const auto [density, k] = GENERATE(table<double, double>({{100.0, 0.04640},
                                                              {200.0, 0.06532},
                                                              {300.0, 0.12597},
                                                              {400.0, 0.25128},
                                                              {500.0, 0.44125},
                                                              {600.0, 0.69588}}));
    const double last_digit = 1e-5;
    CHECK_THAT(heat::snow_conductivity_W_m_K(density), WithinAbs(k, last_digit));
}

TEST_CASE("the two branches of the fit part by 0.6 percent where they meet", "[heat][published]") {
    const double below = heat::snow_conductivity_W_m_K(155.9999999),
                 above = heat::snow_conductivity_W_m_K(156.0);
    CHECK_THAT(below, WithinAbs(0.05950, 1e-5));
    CHECK_THAT(above, WithinAbs(0.05912, 1e-5));
}

TEST_CASE("no conductivity outside the fit", "[heat]") {
    CHECK(std::isnan(heat::snow_conductivity_W_m_K(0.0)));
    CHECK(std::isnan(heat::snow_conductivity_W_m_K(917.0)));
}

// Carslaw and Jaeger (1959), section 2.6; the numbers by hand from sqrt(D P / pi).
TEST_CASE("damping depths of a day and a year", "[heat][published]") {
    CHECK_THAT(heat::damping_depth_m(1.8 / 2.8e6, day_s), WithinAbs(0.132966, 1e-6));
    CHECK_THAT(heat::damping_depth_m(1.8 / 2.8e6, year_s), WithinAbs(2.541173, 1e-6));
    CHECK_THAT(heat::damping_depth_m(2.5 / 2.96e6, day_s), WithinAbs(0.15241, 1e-5));
    const double snow = heat::snow_damping_depth_m(300.0);
    CHECK_THAT(snow, WithinAbs(0.0742, 1e-4));
    CHECK_THAT(std::exp(-0.1 / snow), WithinAbs(0.2596, 1e-3));
    CHECK_THAT(std::exp(-0.3 / snow), WithinAbs(0.0175, 1e-4));
}

TEST_CASE("depth that damps ten kelvin to one, by density", "[heat][published]") {
    const auto [density, depth] = GENERATE(table<double, double>(
        {{100.0, 0.179}, {200.0, 0.151}, {300.0, 0.171}, {400.0, 0.209}, {500.0, 0.248}}));
    CHECK_THAT(heat::depth_from_damping_m(0.1, density), WithinAbs(depth, 1e-3));
}

TEST_CASE("diffusivity comes back from a wave at two depths", "[heat][property]") {
    const double diffusivity = 5e-7, z = 0.2, d = heat::damping_depth_m(diffusivity, day_s);
    const double left = std::exp(-z / d), lag_s = z / d * day_s / (2.0 * 3.14159265358979323846);
    CHECK_THAT(heat::diffusivity_from_amplitudes_m2_s(4.0, 4.0 * left, z, day_s),
               WithinRel(diffusivity, 1e-9));
    CHECK_THAT(heat::diffusivity_from_lag_m2_s(lag_s, z, day_s), WithinRel(diffusivity, 1e-9));
    CHECK(std::isnan(heat::diffusivity_from_amplitudes_m2_s(1.0, 1.5, z, day_s)));
    CHECK(std::isnan(heat::diffusivity_from_lag_m2_s(-5.0, z, day_s)));
}

// SPDX-License-Identifier: Apache-2.0
#include "column/structure.hpp"

#include "heat/water.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <numbers>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;

namespace {

column::Profile two_layers(double upper_degC, double lower_degC, double at_m, double bottom_m) {
    column::Profile p;
    p.depth_m = Eigen::ArrayXd{{0.0, at_m, at_m, bottom_m}};
    p.temperature_degC = Eigen::ArrayXd{{upper_degC, upper_degC, lower_degC, lower_degC}};
    p.density_kg_m3 = column::densities(p.temperature_degC, 0.0);
    return p;
}

template <class Temperature>
column::Profile on_grid(double bottom_m, double step_m, const Temperature& temperature) {
    const auto n = static_cast<Eigen::Index>(std::lround(bottom_m / step_m)) + 1;
    column::Profile p;
    p.depth_m = Eigen::ArrayXd::LinSpaced(n, 0.0, bottom_m);
    p.temperature_degC = p.depth_m.unaryExpr(temperature);
    p.density_kg_m3 = column::densities(p.temperature_degC, 0.0);
    return p;
}

/// A lake whose area falls as (1 - z/H)^power, in fine steps.
column::Hypsograph narrowing(double bottom_m, double power) {
    const Eigen::ArrayXd z = Eigen::ArrayXd::LinSpaced(4001, 0.0, bottom_m);
    return {z, 1e6 * (1.0 - z / bottom_m).max(0.0).pow(power)};
}

} // namespace

// W-01 to W-06: closed forms of the integral, two layers of Tanaka's density, derived by hand.
TEST_CASE("stability of simple columns is the closed form", "[column][published]") {
    const auto layers = two_layers(20.0, 5.0, 5.0, 20.0);
    CHECK_THAT(column::schmidt_stability_J_m2(layers, column::Hypsograph::constant(20.0)),
               WithinRel(647.252632, 1e-8));
    CHECK_THAT(column::schmidt_stability_J_m2(layers, narrowing(20.0, 1.0)),
               WithinRel(323.626316, 1e-6));
    CHECK_THAT(column::schmidt_stability_J_m2(layers, narrowing(20.0, 2.0)),
               WithinRel(182.039803, 1e-5));
    column::Profile linear;
    linear.depth_m = Eigen::ArrayXd{{0.0, 20.0}};
    linear.temperature_degC = Eigen::ArrayXd{{20.0, 5.0}};
    linear.density_kg_m3 = column::densities(linear.temperature_degC, 0.0);
    CHECK_THAT(column::schmidt_stability_J_m2(linear, column::Hypsograph::constant(20.0)),
               WithinRel(575.335673, 1e-8));
    CHECK_THAT(
        column::schmidt_stability_J_m2(two_layers(8.0, 8.0, 5.0, 20.0), narrowing(20.0, 2.0)),
        WithinAbs(0.0, 1e-9));
    CHECK_THAT(column::schmidt_stability_J_m2(two_layers(0.5, 4.0, 2.0, 20.0),
                                              column::Hypsograph::constant(20.0)),
               WithinRel(17.735873, 1e-6));
}

// W-07 to W-10: Thompson and Imberger (1980), Imberger and Patterson (1990), from memory; numbers
// recomputed by hand.
TEST_CASE("the wind's numbers of a two-layer lake", "[column][published]") {
    const double rho = heat::density_tanaka_kg_m3(Celsius::from_degC(20.0));
    const double u2 = column::friction_velocity_squared_m2_s2(5.0, rho);
    CHECK_THAT(std::sqrt(u2), WithinRel(0.006250605, 1e-6));
    const double reduced = 9.80665 * 1.7600373398 / rho;
    CHECK_THAT(reduced, WithinRel(0.01729107748, 1e-8));
    CHECK_THAT(column::wedderburn_number(reduced, 5.0, u2, 1000.0), WithinRel(11.0641476, 1e-7));
    const column::Hypsograph lake{Eigen::ArrayXd{{0.0, 20.0}}, Eigen::ArrayXd{{1e6, 1e6}}};
    const double stability = column::schmidt_stability_J_m2(two_layers(20.0, 5.0, 5.0, 20.0), lake);
    CHECK_THAT(column::lake_number(stability, 5.0, rho, u2, lake), WithinRel(8.2981107, 1e-6));
    CHECK(std::isnan(column::lake_number(stability, 5.0, rho, 0.0, lake)));
    CHECK_THAT(column::wind_at_10m_ms(3.0, 10.0), WithinAbs(3.0, 1e-12));
    CHECK(column::wind_at_10m_ms(3.0, 2.0) > 3.3);
}

// W-11 to W-13, recomputed by hand from Tanaka's density.
TEST_CASE("buoyancy frequency between two waters", "[column][published]") {
    const auto squared = [](double upper, double lower, double apart_m) {
        const double a = heat::density_tanaka_kg_m3(Celsius::from_degC(upper)),
                     b = heat::density_tanaka_kg_m3(Celsius::from_degC(lower));
        return heat::standard_gravity_m_s2 / (0.5 * (a + b)) * (b - a) / apart_m;
    };
    CHECK_THAT(squared(20.0, 15.0, 1.0), WithinRel(8.796888e-3, 1e-6));
    CHECK_THAT(squared(6.0, 5.8, 1.0), WithinRel(5.827879e-5, 1e-6));
    CHECK_THAT(squared(0.0, 1.0, 1.0), WithinRel(5.769664e-4, 1e-6));
    // The program's own: a steep straight piece wider than its scale.
    const auto ramp = on_grid(10.0, 0.05, [](double z) {
        return z < 4.5 ? 20.0 : (z > 5.5 ? 15.0 : 20.0 - 5.0 * (z - 4.5));
    });
    const double period_min =
        2.0 * std::numbers::pi / column::buoyancy_frequency_max_1_s(ramp) / 60;
    CHECK_THAT(period_min, WithinAbs(1.117, 0.06)); // the warm end is the steeper in density
    CHECK(column::buoyancy_frequency_max_1_s(ramp) > std::sqrt(squared(20.0, 15.0, 1.0)));
}

// W-14: depths of the steepest temperature and of the steepest density differ (recomputed).
TEST_CASE("the thermocline of a smooth column", "[column][published]") {
    const auto p =
        on_grid(20.0, 0.05, [](double z) { return 12.5 - 7.5 * std::tanh((z - 6.0) / 1.5); });
    const double scale_of_half_a_metre = 0.02; // the exact derivative is steeper by 1.2 %
    const auto found = column::thermocline(p, false);
    CHECK_THAT(found.depth_m, WithinAbs(5.566195, scale_of_half_a_metre));
    CHECK_THAT(found.gradient_kg_m4, WithinRel(0.672947, 0.015));
    CHECK(found.top_m < found.depth_m);
    CHECK(found.bottom_m > found.depth_m);
    const auto step = column::steepest_temperature(p);
    CHECK_THAT(step.depth_m, WithinAbs(6.0, 1e-6));
    CHECK_THAT(step.gradient_K_m, WithinRel(5.0, 0.01));
}

// W-15: recomputed with cp 4186; ours takes TEOS-10's.
TEST_CASE("heat content of two layers", "[column][published]") {
    CHECK_THAT(column::heat_content_J_m2(two_layers(20.0, 5.0, 5.0, 20.0),
                                         column::Hypsograph::constant(20.0)),
               WithinRel(731.788915e6, 2.5e-3));
}

TEST_CASE("water of one temperature has no thermocline and no end of mixing",
          "[column][property]") {
    const auto p = on_grid(12.0, 0.05, [](double) { return 8.0; });
    CHECK(std::isnan(column::thermocline(p, false).depth_m));
    CHECK(std::isnan(column::mixed_layer_depth_m(p)));
}

TEST_CASE("cold water over warmer is stable under ice", "[column][property]") {
    const auto p = on_grid(12.0, 0.05, [](double z) { return 2.0 - 1.8 * std::exp(-z / 1.0); });
    CHECK(std::isnan(column::thermocline(p, false).depth_m));
    CHECK_THAT(column::thermocline(p, true).depth_m, WithinAbs(1.5, 0.3));
}

TEST_CASE("the mixed layer ends where density has risen by a tenth", "[column][property]") {
    const auto p =
        on_grid(12.0, 0.05, [](double z) { return z < 4.0 ? 20.0 : 20.0 - 2.0 * (z - 4.0); });
    // 0.1 kg m-3 at 20 degC is 0.486 K by Tanaka's expansion.
    CHECK_THAT(column::mixed_layer_depth_m(p), WithinAbs(4.0 + 0.486 / 2.0, 0.01));
}

TEST_CASE("settled densities never fall with depth and keep their mean", "[column][property]") {
    const Eigen::ArrayXd raw{{1.0, 3.0, 2.0, 2.5, 2.2, 5.0, 4.0}};
    const Eigen::ArrayXd out = column::settled(raw);
    for (Eigen::Index i = 1; i < out.size(); ++i)
        CHECK(out(i) >= out(i - 1));
    CHECK_THAT(out.mean(), WithinAbs(raw.mean(), 1e-12));
    CHECK((column::settled(out) - out).abs().maxCoeff() == 0.0);
}

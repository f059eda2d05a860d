// SPDX-License-Identifier: Apache-2.0
#include "heat/vertical_flow.hpp"

#include "base/error.hpp"
#include "heat/snow_ground.hpp"

#include <catch2/catch.hpp>

#include <array>
#include <cmath>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;

namespace {

constexpr double year_s = 365.25 * heat::day_s;
constexpr double spacing_m = 0.10;
const heat::Ground sand{1.8, 2.8e6};

double front_of(double flux_m_d) {
    return heat::front_velocity_m_s(flux_m_d / heat::day_s, sand.heat_capacity_J_m3_K);
}

struct Row {
    double flux_m_d, decay_per_m, turn_rad_m, ratio, lag_rad, lag_h, eta;
};

// The wave of Stallman (1965) worked out by hand for conductivity 1.8 W/m/K, heat capacities 2.8
// and 4.18 MJ/m3/K, 0.10 m apart, one day; an independent finite difference run gives +-0.5 m/d.
const std::array<Row, 11> table{{
    {-2.0, 53.836905, 2.098034, 0.00459085, 0.20980340, 0.801390, 25.66064489},
    {-1.0, 27.469209, 4.031353, 0.06412500, 0.40313535, 1.539864, 6.81389254},
    {-0.5, 15.855883, 6.190736, 0.20482726, 0.61907358, 2.364687, 2.56122757},
    {-0.2, 10.452345, 7.284558, 0.35160934, 0.72845584, 2.782496, 1.43486329},
    {-0.1, 8.924895, 7.460952, 0.40963470, 0.74609516, 2.849874, 1.19621402},
    {0.0, 7.520744, 7.520744, 0.47138767, 0.75207444, 2.872713, 1.0},
    {0.1, 6.237138, 7.460952, 0.53595034, 0.74609516, 2.849874, 0.83597081},
    {0.2, 5.076831, 7.284558, 0.60188848, 0.72845584, 2.782496, 0.69693051},
    {0.5, 2.417097, 6.190736, 0.78528410, 0.61907358, 2.364687, 0.39043778},
    {1.0, 0.591637, 4.031353, 0.94255243, 0.40313535, 1.539864, 0.14675899},
    {2.0, 0.081761, 2.098034, 0.99185726, 0.20980340, 0.801390, 0.03897018},
}};

} // namespace

TEST_CASE("damping depths match the published properties", "[heat][published]") {
    // Worked from the closed form; saturated loose sand of Moene & van Dam (2014), table 2.2.
    const double last_digit = 1e-6;
    CHECK_THAT(heat::damping_depth_m(heat::diffusivity_m2_s(sand), heat::day_s),
               WithinAbs(0.132966, last_digit));
    CHECK_THAT(heat::damping_depth_m(heat::diffusivity_m2_s(sand), year_s),
               WithinAbs(2.541173, last_digit));
    CHECK_THAT(heat::damping_depth_m(heat::diffusivity_m2_s({2.5, 2.96e6}), heat::day_s),
               WithinAbs(0.15241, 1e-5));
    // Snow of 300 kg/m3 with the conductivity of Sturm et al. (1997), J. Glaciol. 43, 26-41.
    const double snow_m =
        heat::damping_depth_m(heat::diffusivity_m2_s({0.12597, 300.0 * 2100.0}), heat::day_s);
    CHECK_THAT(snow_m, WithinAbs(0.0742, 1e-4));
    for (const auto& [depth_m, left] :
         {std::pair{0.1, 0.2596}, std::pair{0.3, 0.0175}, std::pair{0.5, 0.0012}})
        CHECK_THAT(std::exp(-depth_m / snow_m), WithinAbs(left, 1e-4));
}

TEST_CASE("saturated heat capacity mixes water and grains", "[heat][published]") {
    // Moene & van Dam (2014), table 2.2 prints 2.96 for loose saturated sand of porosity 0.4.
    CHECK_THAT(heat::saturated_heat_capacity_J_m3_K(0.4, heat::quartz_heat_capacity_J_m3_K) / 1e6,
               WithinAbs(2.96, 0.02));
    CHECK(heat::saturated_heat_capacity_J_m3_K(0.0, 2e6) == 2e6);
    CHECK_THROWS_AS(heat::saturated_heat_capacity_J_m3_K(1.2, 2e6), DataError);
    CHECK_THROWS_AS(heat::diffusivity_m2_s({1.8, 0.0}), DataError);
}

TEST_CASE("the daily wave goes down as worked by hand", "[heat][published]") {
    const double kappa = heat::diffusivity_m2_s(sand);
    for (const Row& row : table) {
        CAPTURE(row.flux_m_d);
        const double v = front_of(row.flux_m_d);
        const heat::WaveNumbers n = heat::wave_numbers(kappa, v, heat::day_s);
        CHECK_THAT(n.decay_per_m, WithinAbs(row.decay_per_m, 1e-6));
        CHECK_THAT(n.turn_rad_m, WithinAbs(row.turn_rad_m, 1e-6));
        const heat::Damping d = heat::damping(kappa, v, heat::day_s, spacing_m);
        CHECK_THAT(d.amplitude_ratio, WithinAbs(row.ratio, 1e-8));
        CHECK_THAT(d.lag_rad, WithinAbs(row.lag_rad, 1e-8));
        CHECK_THAT(d.lag_rad * 24.0 / 6.28318530717958648, WithinAbs(row.lag_h, 1e-6));
        CHECK_THAT(-std::log(d.amplitude_ratio) / d.lag_rad, WithinRel(row.eta, 1e-7));
        // Identity of the governing equation.
        CHECK_THAT(kappa * n.turn_rad_m *
                       (n.decay_per_m * n.decay_per_m + n.turn_rad_m * n.turn_rad_m) /
                       n.decay_per_m,
                   WithinRel(6.28318530717958648 / heat::day_s, 1e-9));
    }
}

TEST_CASE("every inverse finds the flux of the hand-worked table", "[heat][published]") {
    const double kappa = heat::diffusivity_m2_s(sand);
    const auto flux_m_d = [](double front_m_s) {
        return heat::day_s * heat::flux_of_front_m_s(front_m_s, sand.heat_capacity_J_m3_K);
    };
    const double printed = 1e-6;
    for (const Row& row : table) {
        CAPTURE(row.flux_m_d);
        const heat::Damping d =
            heat::damping(kappa, front_of(row.flux_m_d), heat::day_s, spacing_m);
        CHECK_THAT(flux_m_d(heat::front_from_amplitude_m_s(kappa, heat::day_s, spacing_m,
                                                           d.amplitude_ratio)),
                   WithinAbs(row.flux_m_d, printed));
        const heat::JointFront both = heat::front_from_both(heat::day_s, spacing_m, d);
        CHECK_THAT(flux_m_d(both.front_m_s), WithinAbs(row.flux_m_d, printed));
        CHECK_THAT(both.diffusivity_m2_s, WithinRel(6.428571e-7, 1e-6));
        CHECK_THAT(heat::spacing_from_both_m(kappa, heat::day_s, d), WithinRel(spacing_m, 1e-9));
        if (row.flux_m_d != 0.0) {
            // The lag knows no sign.
            CHECK_THAT(
                flux_m_d(heat::front_speed_from_lag_m_s(kappa, heat::day_s, spacing_m, d.lag_rad)),
                WithinAbs(std::abs(row.flux_m_d), printed));
        }
    }
}

TEST_CASE("what no flux can make gives no flux", "[heat][property]") {
    const double kappa = heat::diffusivity_m2_s(sand);
    CHECK(std::isnan(heat::front_from_amplitude_m_s(kappa, heat::day_s, spacing_m, 0.0)));
    CHECK(std::isnan(heat::front_from_amplitude_m_s(kappa, heat::day_s, spacing_m, 1.1)));
    // A lag longer than conduction's.
    CHECK(std::isnan(heat::front_speed_from_lag_m_s(kappa, heat::day_s, spacing_m, 0.9)));
    CHECK(std::isnan(heat::front_from_both(heat::day_s, spacing_m, {1.2, 0.3}).front_m_s));
    CHECK(std::isnan(heat::front_from_both(heat::day_s, spacing_m, {0.5, -0.3}).front_m_s));
    CHECK_THROWS_AS(heat::wave_numbers(0.0, 0.0, heat::day_s), DataError);
}

TEST_CASE("the steady profile bends as tabulated", "[heat][published]") {
    // Bredehoeft & Papadopulos (1965), equation evaluated by hand.
    const std::array<std::pair<double, std::array<double, 9>>, 7> rows{{
        {-5.0,
         {0.396139, 0.636409, 0.782140, 0.870530, 0.924142, 0.956659, 0.976381, 0.988344,
          0.995599}},
        {-2.0,
         {0.209641, 0.381281, 0.521807, 0.636861, 0.731059, 0.808181, 0.871324, 0.923021,
          0.965347}},
        {-1.0,
         {0.150545, 0.286764, 0.410020, 0.521546, 0.622459, 0.713769, 0.796390, 0.871149,
          0.938793}},
        {0.5,
         {0.079034, 0.162120, 0.249467, 0.341291, 0.437823, 0.539305, 0.645990, 0.758145,
          0.876050}},
        {1.0,
         {0.061207, 0.128851, 0.203610, 0.286231, 0.377541, 0.478454, 0.589980, 0.713236,
          0.849455}},
        {2.0,
         {0.034653, 0.076979, 0.128676, 0.191819, 0.268941, 0.363139, 0.478193, 0.618719,
          0.790359}},
        {5.0,
         {0.004401, 0.011656, 0.023619, 0.043341, 0.075858, 0.129470, 0.217860, 0.363591,
          0.603861}},
    }};
    for (const auto& [beta, shares] : rows)
        for (std::size_t i = 0; i < shares.size(); ++i) {
            const double x = 0.1 * static_cast<double>(i + 1);
            CAPTURE(beta, x);
            CHECK_THAT(heat::steady_share(beta, x), WithinAbs(shares[i], 1e-6));
            CHECK_THAT(heat::steady_share(-beta, 1.0 - x), WithinAbs(1.0 - shares[i], 1e-6));
        }
    CHECK(heat::steady_share(0.0, 0.3) == 0.3);
    CHECK_THAT(heat::steady_share(900.0, 1.0), WithinAbs(1.0, 1e-12));
    CHECK_THAT(heat::steady_share(-900.0, 0.5), WithinAbs(1.0, 1e-12));
    CHECK_THAT(heat::flux_of_beta_m_s(-2.0, 1.8, 2.0) * heat::day_s, WithinAbs(-0.0372057, 1e-7));
    CHECK_THAT(heat::flux_of_beta_m_s(1.0, 1.8, 2.0) * heat::day_s, WithinAbs(0.0186029, 1e-7));
    // Schmidt et al. (2007): 18 above, 10 deep, 12 at 0.3 m is water coming up.
    CHECK_THAT(heat::flux_above_deep_water_m_s(1.8, 0.3, 18.0, 12.0, 10.0),
               WithinAbs(-1.98990e-6, 1e-11));
    CHECK(std::isnan(heat::flux_above_deep_water_m_s(1.8, 0.3, 18.0, 9.0, 10.0)));
}

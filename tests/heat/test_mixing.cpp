// SPDX-License-Identifier: Apache-2.0
#include "heat/mixing.hpp"
#include "stats/lines.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <numbers>
#include <random>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

namespace {
heat::Water water(double litres_s, double degC) {
    return {litres_s, Celsius::from_degC(degC)};
}
} // namespace

// M-04: Briggs, Lautz and McKenzie (2012), Hydrol. Process. 26, 1277-1290: 668 L/s into 14 m3/s are
// "about 5 %".
TEST_CASE("an inflow of Ninemile Creek is about five per cent", "[heat][published]") {
    const auto below = heat::mixed(water(14000.0 - 668.0, 20.0), water(668.0, 10.0));
    const auto share =
        heat::groundwater_share({20.0, 0.0}, {below.temperature.degC(), 0.0}, {10.0, 0.0});
    CHECK_THAT(share.fraction, WithinAbs(0.0477, 5e-5));
}

// M-06: 100 L/s at 18 degC takes up three waters in turn (computed by hand from the heat balance).
TEST_CASE("a cascade of inflows mixes in turn", "[heat]") {
    auto stream = water(100.0, 18.0);
    const std::vector<heat::Water> joins{water(10.0, 9.0), water(15.0, 10.0), water(5.0, 20.0)};
    const std::vector<double> below{17.181818, 16.320000, 16.461538};
    const std::vector<double> shares{0.090909, 0.12, 0.0384615};
    for (std::size_t k = 0; k < 3; ++k) {
        const double above = stream.temperature.degC();
        stream = heat::mixed(stream, joins[k]);
        CHECK_THAT(stream.temperature.degC(), WithinAbs(below[k], 1e-6));
        const auto share = heat::groundwater_share({above, 0.0}, {stream.temperature.degC(), 0.0},
                                                   {joins[k].temperature.degC(), 0.0});
        CHECK_THAT(share.fraction, WithinAbs(shares[k], 1e-6));
    }
}

// M-07 to M-09: no change, no contrast, out of bounds.
TEST_CASE("odd temperatures are told and never clipped", "[heat]") {
    CHECK(heat::groundwater_share({15.0, 0.1}, {15.0, 0.1}, {9.0, 0.1}).fraction == 0.0);
    CHECK_THROWS_AS(heat::groundwater_share({15.0, 0.1}, {14.0, 0.1}, {15.0, 0.1}), DataError);
    const auto outside = heat::groundwater_share({15.0, 0.0}, {16.0, 0.0}, {13.0, 0.0});
    CHECK(outside.fraction == -0.5);
    CHECK_FALSE(outside.physical);
}

// M-20 to M-22: propagation of independent errors (closed form; Monte Carlo below).
TEST_CASE("the sd of a share follows its errors", "[heat]") {
    const auto wide = heat::groundwater_share({16.0, 0.1}, {15.0, 0.1}, {13.5, 0.2});
    CHECK_THAT(wide.fraction, WithinAbs(0.4, 1e-12));
    CHECK_THAT(wide.sd, WithinAbs(0.0565685, 1e-7));
    const auto narrow = heat::groundwater_share({16.0, 0.05}, {15.5, 0.05}, {10.0, 0.5});
    CHECK_THAT(narrow.fraction, WithinAbs(0.0833333, 1e-7));
    CHECK_THAT(narrow.sd, WithinAbs(0.0132673, 1e-7));
    CHECK(narrow.resolvable);
    const auto none = heat::groundwater_share({12.0, 0.05}, {12.02, 0.05}, {12.1, 0.1});
    CHECK_THAT(none.sd, WithinAbs(0.6708, 5e-5));
    CHECK_FALSE(none.resolvable);
}

TEST_CASE("propagated sd agrees with drawing the errors", "[heat][property]") {
    std::mt19937_64 random{99};
    std::normal_distribution<double> unit;
    double sum = 0.0, square = 0.0;
    constexpr int draws = 200000;
    for (int i = 0; i < draws; ++i) {
        const double above = 16.0 + 0.1 * unit(random), below = 15.0 + 0.1 * unit(random),
                     inflow = 13.5 + 0.2 * unit(random);
        const double f = (below - above) / (inflow - above);
        sum += f;
        square += f * f;
    }
    const double mean = sum / draws, sd = std::sqrt(square / draws - mean * mean);
    // M-20: mean 0.40168, sd 0.05739 by four million draws; first order gives 0.05657.
    CHECK_THAT(mean, WithinAbs(0.40168, 5e-4));
    CHECK_THAT(sd, WithinAbs(0.05739, 5e-4));
}

TEST_CASE("an offset common to all temperatures cancels", "[heat][property]") {
    const auto plain = heat::groundwater_share({16.0, 0.1}, {15.0, 0.1}, {13.5, 0.2});
    const auto moved = heat::groundwater_share({16.7, 0.1}, {15.7, 0.1}, {14.2, 0.2});
    CHECK_THAT(moved.fraction, WithinAbs(plain.fraction, 1e-12));
}

// M-30, M-31: T_below = (1 - f) T_above + f T_in over a day.
TEST_CASE("the change over a day gives share and inflow temperature", "[heat]") {
    Eigen::ArrayXd above(24), below(24);
    for (Eigen::Index h = 0; h < 24; ++h) {
        above(h) =
            14.0 + 3.0 * std::cos(2.0 * std::numbers::pi * (static_cast<double>(h) - 15.0) / 24.0);
        below(h) = 0.75 * above(h) + 0.25 * 9.0;
    }
    const auto line = stats::least_squares(above, below);
    CHECK_THAT(line.slope, WithinAbs(0.75, 1e-12));
    CHECK_THAT(line.intercept, WithinAbs(2.25, 1e-11));
    CHECK_THAT(line.intercept / (1.0 - line.slope), WithinAbs(9.0, 1e-10));
    CHECK_THAT(below.mean(), WithinAbs(12.75, 1e-12));
    const double f = 1.0 - (15.0 - 10.5) / (17.0 - 11.0);
    CHECK(f == 0.25);
    CHECK((17.0 * 10.5 - 11.0 * 15.0) / ((17.0 - 11.0) - (15.0 - 10.5)) == 9.0);
}

TEST_CASE("discharge from share carries both errors", "[heat]") {
    const auto q = heat::inflow_discharge_m3s({0.2, 0.01}, {0.04, 0.002});
    CHECK_THAT(q.value, WithinAbs(0.01, 1e-12));
    CHECK_THAT(q.sd, WithinAbs(std::hypot(0.04 / 0.64 * 0.01, 0.25 * 0.002), 1e-12));
}

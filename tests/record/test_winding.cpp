// SPDX-License-Identifier: Apache-2.0
#include "record/winding.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

namespace {

double depth_m(double fibre_m, double diameter_m, double pitch_m) {
    return record::depth_below_datum_m(1500.0 + fibre_m, 1500.0, campaign::Direction::down,
                                       campaign::Winding{diameter_m, pitch_m});
}

} // namespace

// G-44, G-45: fibre per height of a helix, L = (h / p) sqrt((pi D)^2 + p^2), computed; G-48: the
// pole's diameter alone, for 3 mm of cable on a pole of 50 mm, is 5.7 % short.
TEST_CASE("a winding's fibre and height", "[record]") {
    CHECK_THAT(depth_m(31.4318, 0.05, 0.005), WithinAbs(1.0, 1e-5));
    CHECK_THAT(depth_m(1.0, 0.05, 0.005), WithinAbs(0.0318149, 5e-8));
    CHECK_THAT(depth_m(290.1758, 0.0508, 0.0011), WithinAbs(2.0, 1e-5));
    CHECK_THAT(depth_m(113.1073, 0.06, 0.0025), WithinAbs(1.5, 1e-5));
    CHECK_THAT(depth_m(1.0, 0.050, 0.005) / depth_m(1.0, 0.053, 0.005), WithinAbs(1.06, 0.003));
}

TEST_CASE("a straight cable counts its own metres, either way", "[record]") {
    CHECK(record::depth_below_datum_m(107.0, 100.0, campaign::Direction::down, {}) == 7.0);
    CHECK(record::depth_below_datum_m(93.0, 100.0, campaign::Direction::up, {}) == 7.0);
}

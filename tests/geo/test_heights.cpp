// SPDX-License-Identifier: Apache-2.0
#include "heights.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

TEST_CASE("heights run straight between surveyed ones", "[geo]") {
    CHECK(std::isnan(geo::height_between({}, 5.0)));
    CHECK(geo::height_between({{10.0, 400.0}}, 5.0) == 400.0);
    CHECK(geo::height_between({{10.0, 400.0}, {30.0, 410.0}}, 20.0) == 405.0);
    CHECK(geo::height_between({{10.0, 400.0}, {30.0, 410.0}}, 99.0) == 410.0);
}

// G-44, G-45: fibre per height of a helix, L = (h / p) sqrt((pi D)^2 + p^2), computed; G-48: the
// pole's diameter alone, for 3 mm of cable on a pole of 50 mm, is 5.7 % short.
TEST_CASE("a winding's fibre and height", "[geo]") {
    CHECK_THAT(geo::winding_depth_m(31.4318, 0.05, 0.005), WithinAbs(1.0, 1e-5));
    CHECK_THAT(geo::winding_depth_m(1.0, 0.05, 0.005), WithinAbs(0.0318149, 5e-8));
    CHECK_THAT(geo::winding_depth_m(290.1758, 0.0508, 0.0011), WithinAbs(2.0, 1e-5));
    CHECK_THAT(geo::winding_depth_m(113.1073, 0.06, 0.0025), WithinAbs(1.5, 1e-5));
    CHECK_THAT(geo::winding_depth_m(1.0, 0.050, 0.005) / geo::winding_depth_m(1.0, 0.053, 0.005),
               WithinAbs(1.06, 0.003));
}

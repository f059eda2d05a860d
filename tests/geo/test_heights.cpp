// SPDX-License-Identifier: Apache-2.0
#include "heights.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rillstrand;

TEST_CASE("heights run straight between surveyed ones", "[geo]") {
    CHECK(std::isnan(geo::height_between({}, 5.0)));
    CHECK(geo::height_between({{10.0, 400.0}}, 5.0) == 400.0);
    CHECK(geo::height_between({{10.0, 400.0}, {30.0, 410.0}}, 20.0) == 405.0);
    CHECK(geo::height_between({{10.0, 400.0}, {30.0, 410.0}}, 99.0) == 410.0);
}

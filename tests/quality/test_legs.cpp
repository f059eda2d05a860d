// SPDX-License-Identifier: Apache-2.0
#include "quality/legs.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand;

TEST_CASE("the legs of a loop are compared place by place", "[quality]") {
    // 100 m out and back, turned at 100 m; the second leg reads 0.1 K more, and 1.1 K more at 30 m.
    Eigen::ArrayXd fibre_m = Eigen::ArrayXd::LinSpaced(201, 0.0, 200.0), ground_m(201), mean(201);
    std::vector<int> leg(201);
    for (Eigen::Index j = 0; j < 201; ++j) {
        const bool back = fibre_m(j) > 100.0;
        leg[static_cast<std::size_t>(j)] = back ? 2 : 1;
        ground_m(j) = back ? 200.0 - fibre_m(j) : fibre_m(j);
        mean(j) = 10.0 + 0.01 * ground_m(j) + (back ? 0.1 : 0.0);
    }
    mean(170) += 1.0;
    const auto found = quality::compare_legs(fibre_m, ground_m, mean, leg);
    CHECK(found.places == 99); // 1 to 99 m: both neighbours on the second leg
    CHECK(found.difference_K == Approx(0.1 + 1.0 / 99.0));
    CHECK(found.largest_fibre_m == 30.0);
    CHECK(found.largest_K == Approx(1.0 - 1.0 / 99.0));
    CHECK(found.rmse_K == Approx(std::sqrt((98.0 * 0.01 + 1.21) / 99.0)));
}

TEST_CASE("a cable without a second leg has nothing to compare", "[quality]") {
    const Eigen::ArrayXd d = Eigen::ArrayXd::LinSpaced(10, 0.0, 9.0);
    const auto found = quality::compare_legs(d, d, d, std::vector<int>(10, 1));
    CHECK(found.places == 0);
    CHECK(std::isnan(found.rmse_K));
}

// SPDX-License-Identifier: Apache-2.0
#include "bed/depths.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>
#include <random>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;

TEST_CASE("a winding holds as much fibre as its helix is long", "[bed][published]") {
    // L = (h / p) sqrt((pi D)^2 + p^2), worked by hand.
    const double last_digit = 1e-4;
    CHECK_THAT(1.0 * bed::fibre_per_height(campaign::Winding{0.05, 0.005}),
               WithinAbs(31.4318, last_digit));
    CHECK_THAT(2.0 * bed::fibre_per_height(campaign::Winding{0.0508, 0.0011}),
               WithinAbs(290.1758, last_digit));
    CHECK_THAT(1.5 * bed::fibre_per_height(campaign::Winding{0.06, 0.0025}),
               WithinAbs(113.1073, last_digit));
    // The pole's own diameter under a 3 mm cable is 5.7 % short.
    const double pole = bed::fibre_per_height(campaign::Winding{0.05, 0.005});
    const double centre = bed::fibre_per_height(campaign::Winding{0.053, 0.005});
    CHECK_THAT(1.0 - pole / centre, WithinAbs(0.057, 5e-4));
    CHECK(bed::fibre_per_height(std::nullopt) == 1.0);
}

TEST_CASE("depth grows down the rod from the datum", "[bed][property]") {
    campaign::Bed config;
    config.datum_fibre_m = 100.0;
    config.winding = campaign::Winding{0.05, 0.005};
    Eigen::ArrayXd fibre_m(3);
    fibre_m << 90.0, 100.0, 131.4318;
    Eigen::ArrayXd depth = bed::depths_m(config, fibre_m);
    CHECK(depth(0) < 0.0);
    CHECK(depth(1) == 0.0);
    CHECK_THAT(depth(2), WithinAbs(1.0, 1e-5));
    config.direction = campaign::Direction::up;
    CHECK_THAT(bed::depths_m(config, fibre_m)(2), WithinAbs(-1.0, 1e-5));
}

TEST_CASE("white noise is told from a daily wave", "[bed][property]") {
    std::mt19937_64 random{7};
    std::normal_distribution<double> normal;
    const Eigen::Index n = 960;
    Eigen::ArrayXd time_s(n), values(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        time_s(i) = 1800.0 * static_cast<double>(i);
        values(i) = 3.0 * std::cos(6.283185307 * time_s(i) / 86400.0) + 0.05 * normal(random);
    }
    const double few_per_cent = 0.1;
    CHECK_THAT(bed::white_noise_K(time_s, values, 1800.0), WithinRel(0.05, few_per_cent));
}

TEST_CASE("smoothing keeps a straight line and gaps", "[bed][property]") {
    const Eigen::Index n = 100;
    Eigen::ArrayXd time_s(n);
    Eigen::ArrayXXd values(n, 1);
    for (Eigen::Index i = 0; i < n; ++i) {
        time_s(i) = 1.9e9 + 1800.0 * static_cast<double>(i);
        values(i, 0) = 4.0 + 0.01 * static_cast<double>(i);
    }
    values(50, 0) = std::numeric_limits<double>::quiet_NaN();
    for (Eigen::Index i = 70; i < 90; ++i)
        values(i, 0) = std::numeric_limits<double>::quiet_NaN();
    const Eigen::ArrayXXd smooth = bed::smoothed_in_time(time_s, values, 3600.0);
    CHECK_THAT(smooth(50, 0), WithinAbs(4.5, 1e-9));
    CHECK_THAT(smooth(20, 0), WithinAbs(4.2, 1e-9));
    CHECK(std::isnan(smooth(80, 0)));
}

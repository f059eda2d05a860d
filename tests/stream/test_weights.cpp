// SPDX-License-Identifier: Apache-2.0
#include "stream/weights.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <numbers>

using namespace rillstrand::stream;

namespace {
Frame two_channels(const Eigen::ArrayXd& upper, const Eigen::ArrayXd& lower) {
    Frame frame;
    const Eigen::Index n = upper.size();
    frame.time_s = Eigen::ArrayXd::LinSpaced(n, 0.0, 3600.0 * double(n - 1));
    frame.interval_s = 3600.0;
    frame.place_m = Eigen::ArrayXd::LinSpaced(2, 0.0, 10.0);
    frame.water_degC.resize(n, 2);
    frame.water_degC.col(0) = upper;
    frame.water_degC.col(1) = lower;
    frame.mean_degC = upper;
    frame.white_K = Eigen::ArrayXd::Constant(2, 0.01);
    return frame;
}
double share(const Frame& frame, const Weighting& w) {
    const Profile p = make_profile(frame, w);
    return 1.0 - std::exp(-(p.value[1] - p.value[0]));
}
} // namespace

// Tu = 14 + 3 cos(2 pi (t - 15) / 24), hourly, f = 0.25, Tin = 9: computed from the mixing law.
TEST_CASE("every weighting gives the share of one mixing law", "[stream][property]") {
    Eigen::ArrayXd upper(24);
    for (Eigen::Index i = 0; i < 24; ++i)
        upper[i] = 14.0 + 3.0 * std::cos((double(i) - 15.0) * std::numbers::pi / 12.0);
    const double f = 0.25, source = 9.0;
    const Eigen::ArrayXd lower = (1.0 - f) * upper + f * source;
    CHECK(lower.mean() == Approx(12.75));
    const Frame frame = two_channels(upper, lower);
    Patterns patterns;
    patterns.gradient = Eigen::ArrayXd::LinSpaced(24, -1.0, 1.0);
    patterns.change = Eigen::ArrayXd::LinSpaced(24, 0.0, 1.0).square();
    patterns.sun = upper.max(15.0) - 15.0;
    patterns.night = patterns.sun <= 0.0;
    const double rounding = 1e-6;
    for (const Weighting& w :
         make_weightings(frame, patterns, Eigen::ArrayXd::Constant(24, source)))
        CHECK(share(frame, w) == Approx(f).margin(rounding));
    SECTION("without the inflow's temperature too, from the damped swing") {
        for (const Weighting& w : make_weightings(frame, patterns, std::nullopt))
            CHECK(share(frame, w) == Approx(f).margin(rounding));
    }
    SECTION("an offset common to all temperatures leaves the share as it is") {
        const Frame warm = two_channels(upper + 0.7, lower + 0.7);
        for (const Weighting& w :
             make_weightings(warm, patterns, Eigen::ArrayXd::Constant(24, source + 0.7)))
            CHECK(share(warm, w) == Approx(f).margin(rounding));
    }
    SECTION("no change is no inflow") {
        const Frame still = two_channels(upper, upper);
        for (const Weighting& w :
             make_weightings(still, patterns, Eigen::ArrayXd::Constant(24, source)))
            CHECK(share(still, w) == Approx(0.0).margin(rounding));
    }
    SECTION("a step that is constant in time vanishes where constants are shut out") {
        const Frame lossy = two_channels(upper, upper - 0.2);
        for (const Weighting& w : make_weightings(lossy, patterns, std::nullopt))
            CHECK(share(lossy, w) == Approx(0.0).margin(rounding));
    }
}

TEST_CASE("the sun stands where almanacs have it", "[stream]") {
    // Equinox 2035-03-21 12:00 UTC on the Greenwich meridian at 50 N: 90 - 50 + about 0.1 degrees
    // (spherical astronomy; solar noon seven minutes later changes the elevation by 0.02)
    const double noon = 2058091200.0;
    const double elevation = std::asin(sine_of_sun(noon, 0.0, 50.0)) * 180.0 / std::numbers::pi;
    CHECK(elevation == Approx(40.0).margin(0.6));
    CHECK(sine_of_sun(noon - 43200.0, 0.0, 50.0) < -0.6);
}

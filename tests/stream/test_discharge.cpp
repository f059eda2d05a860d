// SPDX-License-Identifier: Apache-2.0
#include "stream/discharge.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rillstrand::stream;

namespace {
Gain gain(double at_m, double share, double share_sd) {
    return {at_m, at_m, -std::log(1.0 - share), share_sd / (1.0 - share)};
}
} // namespace

// Cascade 100 -> +10 -> +15 -> +5 L/s: shares 0.090909, 0.12, 0.0384615 of the flow below each
// (mass balance, computed by hand).
TEST_CASE("discharge along a cascade keeps the mass balance", "[stream][property]") {
    const std::vector<Gain> gains{gain(10.0, 10.0 / 110.0, 1e-4), gain(20.0, 15.0 / 125.0, 1e-4),
                                  gain(30.0, 5.0 / 130.0, 1e-4)};
    Eigen::ArrayXd places(4);
    places << 5.0, 15.0, 25.0, 35.0;
    const DischargeLine line = discharge_line(places, gains, {{-1.0, 0.100, 0.001}});
    const double tight = 1e-9;
    CHECK(line.discharge_m3s[0] == Approx(0.100).margin(tight));
    CHECK(line.discharge_m3s[1] == Approx(0.110).margin(tight));
    CHECK(line.discharge_m3s[2] == Approx(0.125).margin(tight));
    CHECK(line.discharge_m3s[3] == Approx(0.130).margin(tight));
    CHECK(line.gain_m3s[0] == Approx(0.010).margin(tight));
    CHECK(line.gain_m3s[1] == Approx(0.015).margin(tight));
    CHECK(line.gain_m3s[2] == Approx(0.005).margin(tight));

    SECTION("a gauging at the other end gives the same line") {
        const DischargeLine up = discharge_line(places, gains, {{40.0, 0.130, 0.0013}});
        CHECK(up.discharge_m3s[0] == Approx(0.100).margin(tight));
        CHECK(up.sd_m3s[0] > 0.001); // the error of the shares comes on top
    }
    SECTION("two gaugings are better than one") {
        const DischargeLine two =
            discharge_line(places, gains, {{-1.0, 0.100, 0.001}, {40.0, 0.130, 0.0013}});
        CHECK(two.sd_m3s[1] < line.sd_m3s[1]);
    }
}

TEST_CASE("the error of an inflow's discharge is that of share and gauging together", "[stream]") {
    Eigen::ArrayXd place(1);
    place << 15.0;
    const double q = 0.05, q_sd = 0.002, f = 0.1, f_sd = 0.01;
    const DischargeLine line = discharge_line(place, {gain(10.0, f, f_sd)}, {{0.0, q, q_sd}});
    // Qin = Q f / (1 - f), first-order propagation of independent errors
    const double expected = std::hypot(q_sd * f / (1.0 - f), q * f_sd / std::pow(1.0 - f, 2));
    CHECK(line.gain_sd_m3s[0] == Approx(expected).epsilon(1e-6));
}

TEST_CASE("closure tells lost water from agreement", "[stream]") {
    const std::vector<Gain> gains{gain(10.0, 0.10, 0.005)};
    const auto agree = closures(gains, {{0.0, 0.090, 0.002}, {50.0, 0.100, 0.002}});
    REQUIRE(agree.size() == 1);
    CHECK(agree[0].text.find("agree") != std::string::npos);
    const auto lost = closures(gains, {{0.0, 0.090, 0.002}, {50.0, 0.080, 0.002}});
    CHECK(lost[0].text.find("lost") != std::string::npos);
    const auto more = closures(gains, {{0.0, 0.090, 0.002}, {50.0, 0.130, 0.002}});
    CHECK(more[0].text.find("more comes in") != std::string::npos);
}

// SPDX-License-Identifier: Apache-2.0
#include "quality/plan.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <random>
#include <vector>

using namespace rillstrand;
using Catch::Matchers::Contains;

namespace {

const quality::PlanRow* row_of(const std::vector<quality::PlanRow>& rows, const char* quantity) {
    const auto found = std::find_if(rows.begin(), rows.end(), [&](const quality::PlanRow& row) {
        return row.quantity.find(quantity) != std::string::npos;
    });
    return found == rows.end() ? nullptr : &*found;
}

} // namespace

// Constants of optics: exact SI light speed, refractive indices of glass fibre.
TEST_CASE("fibre lengths and pulse rates follow from the speed of light", "[quality][published]") {
    CHECK(quality::metres_per_ns(1.4677) == Approx(0.1021300).margin(5e-8));
    CHECK(quality::metres_per_ns(1.468) == Approx(0.1021091).margin(5e-8));
    CHECK(quality::metres_per_ns(1.48) == Approx(0.1012813).margin(5e-8));
    CHECK(quality::metres_per_ns(1.50) == Approx(0.0999308).margin(5e-8));
    CHECK(10.0 * quality::metres_per_ns(1.468) == Approx(1.02).margin(0.005));
    CHECK(1e6 / quality::highest_pulse_rate_Hz(1000.0, 1.468) == Approx(9.79344).margin(5e-6));
    CHECK(quality::highest_pulse_rate_Hz(10000.0, 1.468) == Approx(10211.0).margin(1.0));
}

// dT = T^2 / gamma d(ln R) worked by hand with gamma 482 K; 0.01 dB is 0.0023026 in ln R.
TEST_CASE("a splice left unmended spoils temperatures by a third of a kelvin",
          "[quality][published]") {
    CHECK(quality::step_loss_error_K(0.01, 0.0) == Approx(0.356).margin(5e-4));
    CHECK(quality::step_loss_error_K(0.01, 20.0) == Approx(0.411).margin(5e-4));
    const double dB_of_a_thousandth = 0.001 * 10.0 / std::log(10.0);
    CHECK(quality::step_loss_error_K(dB_of_a_thousandth, 10.0) == Approx(0.1663).margin(5e-5));
}

TEST_CASE("white noise falls with the root of time down to the floor", "[quality][published]") {
    CHECK(quality::averaged_noise_K(0.1, 30.0, 900.0, 0.0) == Approx(0.018257).margin(5e-7));
    CHECK(quality::averaged_noise_K(0.1, 30.0, 3600.0, 0.0) == Approx(0.009129).margin(5e-7));
    CHECK(quality::averaged_noise_K(0.1, 30.0, 1e12, 0.02) == Approx(0.02));
    CHECK(quality::averaged_noise_K(0.1, 30.0, 10.0, 0.0) == Approx(0.1));
}

// Convolving a patch with a Gaussian of 1 m full width at half maximum (its 10-90 % width is
// 1.088450 m), integrals of the normal law.
TEST_CASE("a patch narrower than the response is seen weakened", "[quality][published]") {
    const double response_m = 1.088450;
    CHECK(quality::seen_of_patch(0.25, response_m) == Approx(0.2315).margin(5e-5));
    CHECK(quality::seen_of_patch(0.5, response_m) == Approx(0.4439).margin(5e-5));
    CHECK(quality::seen_of_patch(1.0, response_m) == Approx(0.7610).margin(5e-5));
    CHECK(quality::seen_of_patch(2.0, response_m) == Approx(0.9815).margin(5e-5));
    CHECK(quality::seen_of_patch(3.0, response_m) == Approx(0.9996).margin(5e-5));
}

TEST_CASE("the smallest share lies three sd of simulated shares from none", "[quality][property]") {
    std::mt19937_64 chance{3};
    std::normal_distribution<double> normal{0.0, 1.0};
    for (const double side_K : {0.002, 0.05, 0.3, 0.9}) {
        const double contrast_K = 4.0;
        const double share = quality::smallest_share(side_K, contrast_K);
        CHECK(quality::side_sd_for_share_K(share, contrast_K) == Approx(side_K));
        CHECK(quality::side_sd_for_share_K(share, -contrast_K) == Approx(side_K));
        // Physically: water of 14 degC takes in water of 18 degC; the share is then worked out.
        double sum = 0.0, sum2 = 0.0;
        const int n = 20000;
        for (int i = 0; i < n; ++i) {
            const double above = 14.0 + side_K * normal(chance);
            const double below = 14.0 + share * contrast_K + side_K * normal(chance);
            // The inflow's temperature is known; the contrast shares the error above.
            const double found = (below - above) / (18.0 - above);
            if (std::abs(18.0 - above) < 1.0)
                continue;
            sum += found;
            sum2 += found * found;
        }
        const double sd = std::sqrt(sum2 / n - std::pow(sum / n, 2));
        CHECK(sd == Approx(share / 3.0).epsilon(side_K > 0.5 ? 0.15 : 0.03));
    }
    CHECK(std::isnan(quality::smallest_share(2.0, 4.0)));
}

TEST_CASE("two baths hold the end of a fibre to the sd wanted", "[quality][property]") {
    std::mt19937_64 chance{4};
    std::normal_distribution<double> normal{0.0, 0.03};
    const double length_m = 1000.0;
    const double apart_m = quality::bath_distance_m(length_m, 0.03, 0.05);
    double sum2 = 0.0;
    const int n = 20000;
    for (int i = 0; i < n; ++i) {
        const double first = normal(chance);
        const double second = normal(chance);
        const double end = first + (second - first) * length_m / apart_m;
        sum2 += end * end;
    }
    CHECK(std::sqrt(sum2 / n) == Approx(0.05).epsilon(0.03));
    CHECK(quality::bath_distance_m(1000.0, 0.05, 0.05) == Approx(1000.0));
    CHECK(std::isnan(quality::bath_distance_m(1000.0, 0.05, 0.03)));
}

// A drum of 0.1 m with 2 mm of height a turn: one turn is 0.314166 m of fibre.
TEST_CASE("a winding turns fibre into height", "[quality]") {
    const double turn_m = std::sqrt(std::pow(3.14159265358979 * 0.1, 2) + 0.002 * 0.002);
    CHECK(quality::winding_height_m(turn_m, 0.1, 0.002) == Approx(0.002));
    CHECK(quality::winding_height_m(100.0 * turn_m, 0.1, 0.002) == Approx(0.2));
}

TEST_CASE("a plan has a line for what is said and none for the rest", "[quality]") {
    quality::PlanInput input;
    auto rows = quality::make_plan(input);
    CHECK(row_of(rows, "smallest inflow") == nullptr);
    CHECK(row_of(rows, "winding") == nullptr);
    for (const auto& row : rows) {
        CHECK_FALSE(row.formula.empty());
        CHECK_FALSE(row.source.empty());
    }
    input.contrast_K = -5.0;
    input.winding_diameter_m = 0.1;
    input.winding_pitch_m = 0.002;
    rows = quality::make_plan(input);
    REQUIRE(row_of(rows, "smallest inflow share") != nullptr);
    CHECK(row_of(rows, "smallest inflow share")->value > 0.0);
    CHECK(row_of(rows, "smallest inflow that") == nullptr);
    REQUIRE(row_of(rows, "winding between samples") != nullptr);
    CHECK(row_of(rows, "winding between samples")->value == Approx(3.183).margin(0.001));
    // An hour of averages, then the time for the share that an hour just finds: an hour.
    input.share = row_of(rows, "smallest inflow share")->value;
    rows = quality::make_plan(input);
    CHECK(row_of(rows, "averaging time that finds")->value == Approx(3600.0));
    CHECK(row_of(rows, "contrast that shows")->value == Approx(5.0));
}

TEST_CASE("a plan from values that cannot be is refused by name", "[quality]") {
    quality::PlanInput input;
    input.noise_K = -0.1;
    CHECK_THROWS_WITH(quality::make_plan(input), Contains("--noise-c is -0.1"));
    input = {};
    input.contrast_K = 0.0;
    CHECK_THROWS_WITH(quality::make_plan(input), Contains("without a contrast no inflow shows"));
    input = {};
    input.average_s = 10.0;
    CHECK_THROWS_WITH(quality::make_plan(input), Contains("at least the time of one sample"));
    input = {};
    input.winding_pitch_m = 0.01;
    CHECK_THROWS_AS(quality::make_plan(input), UsageError);
    input = {};
    input.length_m = std::nan("");
    CHECK_THROWS_WITH(quality::make_plan(input), Contains("--length-m"));
}

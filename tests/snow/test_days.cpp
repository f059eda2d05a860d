// SPDX-License-Identifier: Apache-2.0
#include "series.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

namespace {

snow::Days days_of(const snow::SnowInput& input, double offset_s = 0.0) {
    return snow::make_days(input.time_s, input.bin_s, input.temperature_degC, offset_s);
}

} // namespace

// A pure daily sine of range R has amplitude R / 2 and standard deviation R / (2 sqrt 2).
TEST_CASE("features of a pure daily sine", "[snow][property]") {
    const auto input = snow_test::hourly(snow_test::repeat({{3, {2.0, 8.0}}}));
    const snow::Days days = days_of(input);
    REQUIRE(days.n_day() == 3);
    CHECK(days.date[0] == "2031-01-01");
    CHECK_THAT(days.mean_degC(1, 0), WithinAbs(2.0, 1e-5));
    CHECK_THAT(days.harmonic_K(1, 0), WithinAbs(8.0, 1e-4));
    // The 5 to 95 % range of a sine, over 0.9, is 1.09 of its range over 24 whole hours.
    CHECK_THAT(days.swing_K(1, 0), WithinAbs(8.0, 0.8));
    // Half a day of a sine keeps most of its spread.
    CHECK(days.calm_swing_K(1, 0) > 4.0);
    CHECK(days.calm_swing_K(1, 0) < 9.0);
}

TEST_CASE("noise is taken out of the swing", "[snow][property]") {
    const auto input = snow_test::hourly(snow_test::repeat({{60, {-1.0, 0.0}}}), 0.2);
    const snow::Days days = days_of(input);
    CHECK_THAT(days.noise_K(0), WithinAbs(0.2, 0.05));
    CHECK(days.swing_K.mean() < 0.35);
    CHECK(days.calm_swing_K.mean() < 0.25);
}

TEST_CASE("days begin at local solar midnight", "[snow]") {
    CHECK_THAT(snow::solar_offset_s(15.0), WithinAbs(3600.0, 1e-9));
    auto input = snow_test::hourly(snow_test::repeat({{3, {0.0, 4.0}}}));
    const snow::Days days = days_of(input, 6.0 * 3600.0);
    REQUIRE(days.n_day() == 4);
    CHECK(days.samples(0, 0) == 18.0);
    CHECK(days.samples(1, 0) == 24.0);
    CHECK(days.samples(3, 0) == 6.0);
    CHECK(days.date[0] == "2031-01-01");
    CHECK(days.date[3] == "2031-01-04");
    CHECK(days.first_s(1) == input.time_s(0) + 18.0 * 3600.0 - 1800.0);
}

TEST_CASE("a day with under a quarter of its samples is missing", "[snow]") {
    auto input = snow_test::hourly(snow_test::repeat({{3, {0.0, 4.0}}}));
    for (Eigen::Index i = 24; i < 43; ++i)
        input.temperature_degC(i, 0) = std::numeric_limits<float>::quiet_NaN();
    const snow::Days days = days_of(input);
    CHECK(days.samples(1, 0) == 5.0);
    CHECK(std::isnan(days.mean_degC(1, 0)));
    CHECK(std::isnan(days.swing_K(1, 0)));
    CHECK(std::isfinite(days.mean_degC(2, 0)));
}

TEST_CASE("one calm half shows whatever the other did", "[snow]") {
    auto input = snow_test::hourly(snow_test::repeat({{2, {0.0, 0.0}}}));
    for (Eigen::Index i = 12; i < 24; ++i) // melts out at noon
        input.temperature_degC(i, 0) =
            static_cast<float>(8.0 - std::abs(static_cast<double>(i) - 15.0));
    const snow::Days days = days_of(input);
    CHECK(days.calm_swing_K(0, 0) < 0.1);
    CHECK_THAT(days.calm_mean_degC(0, 0), WithinAbs(0.0, 1e-6));
    CHECK(days.swing_K(0, 0) > 5.0);
}

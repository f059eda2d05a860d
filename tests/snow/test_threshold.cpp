// SPDX-License-Identifier: Apache-2.0
#include "series.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand;
using snow_test::repeat;

namespace {

/// Ten bare days, thirty under dry snow, eight at the zero curtain, ten bare days.
std::vector<snow_test::Day> winter() {
    return repeat({{10, {4.0, 8.0}}, {30, {-1.0, 0.2}}, {8, {0.0, 0.0}}, {10, {4.0, 8.0}}});
}

snow::SnowFindings by_rule(const std::vector<snow_test::Day>& days, double minimum_days) {
    auto input = snow_test::hourly(days);
    input.config.method = campaign::SnowMethod::threshold;
    input.config.swing_below_c = 1.0;
    input.config.mean_below_c = 2.0;
    input.config.minimum_days = minimum_days;
    return snow::interpret(input);
}

} // namespace

TEST_CASE("a made winter: snow from day 11 to 48, melt-out at the end of day 48", "[snow]") {
    const snow::SnowFindings f = by_rule(winter(), 3.0);
    for (Eigen::Index d = 0; d < 58; ++d)
        CHECK((f.state(d, 0) == snow::State::snow) == (d >= 10 && d < 48));
    CHECK(f.channels.cover_onset[0] == 10);
    CHECK(f.channels.melt_out[0] == 48);
    CHECK(f.channels.covered_days(0) == 38.0);
    CHECK(f.channels.spells[0] == 1);
}

TEST_CASE("the model agrees on the made winter and tells the zero curtain", "[snow]") {
    auto input = snow_test::hourly(winter(), 0.05);
    const snow::SnowFindings f = snow::interpret(input);
    for (Eigen::Index d = 0; d < 58; ++d) {
        CHECK((f.probability(d, 0) > 0.5) == (d >= 10 && d < 48));
        if (d >= 10 && d < 40)
            CHECK(f.condition(d, 0) == snow::Condition::dry_snow);
        if (d >= 40 && d < 48)
            CHECK(f.condition(d, 0) == snow::Condition::melting_snow);
    }
    CHECK(f.channels.melt_out[0] == 48);
}

TEST_CASE("one bare day inside the cover is bridged in dates, not in days", "[snow]") {
    auto days = winter();
    days[24] = {3.0, 8.0};
    SECTION("runs of three days: it stays one bare day") {
        const snow::SnowFindings f = by_rule(days, 3.0);
        CHECK(f.state(24, 0) == snow::State::bare);
        CHECK(f.channels.covered_days(0) == 37.0);
        CHECK(f.channels.cover_onset[0] == 10);
        CHECK(f.channels.melt_out[0] == 48);
    }
    SECTION("runs of twenty days: the fourteen before it are no cover") {
        const snow::SnowFindings f = by_rule(days, 20.0);
        CHECK(f.state(12, 0) == snow::State::bare);
        CHECK(f.channels.cover_onset[0] == 25);
        CHECK(f.channels.covered_days(0) == 23.0);
    }
}

TEST_CASE("a mild, cloudy day without swing is not snow", "[snow]") {
    const auto days = repeat({{10, {7.0, 6.0}}, {4, {6.0, 0.5}}, {10, {7.0, 6.0}}});
    SECTION("by the ceiling on the mean") {
        const snow::SnowFindings f = by_rule(days, 1.0);
        CHECK((f.state == snow::State::bare).all());
    }
    SECTION("by the model, since snow cannot stand at 6 degC") {
        const snow::SnowFindings f = snow::interpret(snow_test::hourly(days, 0.05));
        CHECK((f.probability < 0.1).all());
    }
}

TEST_CASE("a missing day is unknown and neither makes nor breaks a run", "[snow]") {
    auto input = snow_test::hourly(winter());
    input.temperature_degC.middleRows(24 * 20, 24) = std::numeric_limits<float>::quiet_NaN();
    const snow::Days days = snow::make_days(input.time_s, input.bin_s, input.temperature_degC, 0.0);
    const auto state = snow::threshold_states(days, 1.0, 2.0, 30.0);
    CHECK(state(20, 0) == snow::State::unknown);
    CHECK(state(19, 0) == snow::State::snow);
    CHECK(state(21, 0) == snow::State::snow);
}

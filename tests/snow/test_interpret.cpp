// SPDX-License-Identifier: Apache-2.0
#include "judge.hpp"
#include "series.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <limits>

using namespace rillstrand;
using Catch::Matchers::Contains;
using Catch::Matchers::WithinAbs;

namespace {

hillside::Setup small(hillside::Season season) {
    hillside::Setup setup;
    setup.season = season;
    setup.channels = 12;
    setup.seed = 5;
    return setup;
}

} // namespace

TEST_CASE("gaps of days do not part a cover", "[snow]") {
    auto setup = small(hillside::Season::melt_out);
    setup.missing_fraction = 0.25;
    const auto h = make_hillside(setup);
    const auto f = snow::interpret(input_of(h, setup, false));
    hillside::Score s;
    judge(h, f, s);
    CHECK(f.probability.isFinite().all());
    CHECK(s.right / s.days > 0.95);
    for (Eigen::Index d = 0; d < f.days.n_day(); ++d)
        CHECK(std::isnan(f.cover.covered_fraction(d)) == std::isnan(f.days.mean_degC(d, 0)));
}

TEST_CASE("one channel is enough", "[snow]") {
    auto setup = small(hillside::Season::melt_out);
    setup.channels = 1;
    hillside::Score s;
    for (setup.seed = 1; setup.seed < 9; ++setup.seed) {
        const auto h = make_hillside(setup);
        judge(h, snow::interpret(input_of(h, setup, false)), s);
    }
    CHECK(s.right / s.days > 0.95);
}

TEST_CASE("a channel without any sample does not disturb the others", "[snow]") {
    auto setup = small(hillside::Season::melt_out);
    const auto h = make_hillside(setup);
    auto input = input_of(h, setup, false);
    input.temperature_degC.col(4).setConstant(std::numeric_limits<float>::quiet_NaN());
    const auto f = snow::interpret(input);
    CHECK(f.probability.leftCols(4).isFinite().all());
    CHECK(f.probability.rightCols(7).isFinite().all());
    CHECK(f.probability.col(4).isNaN().all());
    CHECK((f.state.col(4) == snow::State::unknown).all());
    CHECK(std::isnan(f.channels.covered_days(4)));
    CHECK(std::isfinite(f.cover.covered_fraction(3)));
}

TEST_CASE("the record's own wave tells where a day begins, with a remark", "[snow]") {
    auto setup = small(hillside::Season::melt_out);
    setup.longitude_deg = 120.0;
    const auto h = make_hillside(setup);
    auto input = input_of(h, setup, false);
    input.longitude_deg.reset();
    const auto f = snow::interpret(input);
    CHECK_THAT(f.days.offset_s / 3600.0, WithinAbs(8.0, 1.0));
    REQUIRE_FALSE(f.cautions.empty());
    CHECK_THAT(f.cautions.front(), Contains("utc_offset_h"));
}

TEST_CASE("a record of one day is refused", "[snow]") {
    const auto input = snow_test::hourly(snow_test::repeat({{1, {2.0, 3.0}}}));
    CHECK_THROWS_WITH(snow::interpret(input), Contains("under two days"));
}

TEST_CASE("an instrument that reads half a kelvin high changes little", "[snow]") {
    auto setup = small(hillside::Season::melt_out);
    setup.channels = 40;
    setup.bias_K = 0.4;
    const auto h = make_hillside(setup);
    hillside::Score s;
    judge(h, snow::interpret(input_of(h, setup, false)), s);
    CHECK(s.right / s.days > 0.95);
}

TEST_CASE("channels of a summer are bare", "[snow]") {
    const auto days = snow_test::repeat({{20, {14.0, 9.0}}, {3, {11.0, 1.0}}, {20, {15.0, 10.0}}});
    const auto f = snow::interpret(snow_test::hourly(days, 0.1));
    CHECK((f.probability < 0.05).all());
    CHECK(f.channels.cover_onset[0] == -1);
    CHECK(f.channels.covered_days(0) == 0.0);
    CHECK(std::isnan(f.channels.melt_out_sd_d(0)));
}

TEST_CASE("a whole record under snow has no melt-out", "[snow]") {
    const auto days = snow_test::repeat({{60, {-1.0, 0.1}}});
    const auto f = snow::interpret(snow_test::hourly(days, 0.05));
    CHECK(f.channels.melt_out[0] == -1);
    CHECK(std::isnan(f.channels.insulation_index(0)));
}

TEST_CASE("onset and melt-out bridge gaps of one day", "[snow]") {
    using snow::State;
    Eigen::Array<State, Eigen::Dynamic, Eigen::Dynamic> state(12, 1);
    const std::string days = "bssbbsssbssb"; // days 5 to 11 with one bare day bridged
    Eigen::ArrayXXd p(12, 1);
    for (Eigen::Index d = 0; d < 12; ++d) {
        state(d, 0) = days[static_cast<std::size_t>(d)] == 's' ? State::snow : State::bare;
        p(d, 0) = state(d, 0) == State::snow ? 0.99 : 0.01;
    }
    const auto c = snow::find_channels(Eigen::ArrayXd::Constant(1, 3.0), state, p);
    CHECK(c.cover_onset[0] == 5);
    CHECK(c.melt_out[0] == 11);
    CHECK(c.spells[0] == 2);
    CHECK(c.covered_days(0) == 7.0);
    state.setConstant(State::snow);
    CHECK(snow::find_channels(Eigen::ArrayXd::Constant(1, 3.0), state, p).cover_onset[0] == 0);
}

TEST_CASE("classes of ground partition the channels", "[snow]") {
    auto setup = small(hillside::Season::melt_out);
    const auto h = make_hillside(setup);
    auto input = input_of(h, setup, false);
    input.elevation_m = Eigen::ArrayXd::LinSpaced(12, 1500.0, 1555.0);
    input.slope_deg = Eigen::ArrayXd::LinSpaced(12, 2.0, 35.0);
    input.aspect_deg = Eigen::ArrayXd::LinSpaced(12, 0.0, 330.0);
    const auto f = snow::interpret(input);
    for (const char* kind : {"elevation", "slope", "aspect"}) {
        Eigen::Index n = 0;
        double weighted = 0.0;
        for (const auto& c : f.classes)
            if (c.kind == kind) {
                n += c.channels;
                weighted += static_cast<double>(c.channels) * c.cover.covered_fraction(20);
            }
        CHECK(n == 12);
        CHECK_THAT(weighted / 12.0, WithinAbs(f.cover.covered_fraction(20), 1e-9));
    }
}

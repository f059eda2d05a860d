// SPDX-License-Identifier: Apache-2.0
#include "judge.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand;
using hillside::Season;

namespace {

hillside::Score winters(Season season, std::uint64_t first, std::uint64_t last,
                        double burial_m = 0.0, bool with_air = false) {
    hillside::Score score;
    for (std::uint64_t seed = first; seed <= last; ++seed) {
        hillside::Setup setup;
        setup.season = season;
        setup.seed = seed;
        setup.burial_depth_m = burial_m;
        setup.noise_K = 0.05 + 0.02 * static_cast<double>(seed % 6);
        const hillside::Hillside h = make_hillside(setup);
        judge(h, snow::interpret(input_of(h, setup, with_air)), score);
    }
    return score;
}

} // namespace

// Limits leave room for the luck of eight seeds; tests/bench/snow_honesty.cpp shows more of them.
TEST_CASE("melt-out over ridges, gullies, forest and tree wells", "[snow][property]") {
    const hillside::Score s = winters(Season::melt_out, 101, 108);
    CHECK(s.right / s.days >= 0.98);
    CHECK(s.brier / s.days <= 0.015);
    CHECK(s.reliability() <= 0.003);
    CHECK(s.melts_near / s.melts >= 0.85);
    CHECK(std::sqrt(s.cover_square / s.covers) <= 0.05);
    CHECK(s.cover_inside / s.covers >= 0.9);
}

TEST_CASE("a winter with early snow that comes and goes", "[snow][property]") {
    const hillside::Score s = winters(Season::whole_winter, 101, 106);
    CHECK(s.right / s.days >= 0.945);
    CHECK(s.brier / s.days <= 0.045);
    CHECK(s.cover_inside / s.covers >= 0.85);
}

TEST_CASE("a grey, cold week over bare ground is not snow", "[snow][property]") {
    const hillside::Score s = winters(Season::thin_and_grey, 101, 106);
    CHECK(s.right / s.days >= 0.9);
    CHECK(s.grey_right / s.grey >= 0.93);
}

// SPDX-License-Identifier: Apache-2.0
// Small campaigns made by physics (never by the interpretation's own formula): are the numbers
// true?
#include "scenarios.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand::stream;

TEST_CASE("truths lie within two standard deviations as often as they should",
          "[stream][property]") {
    scenarios::Tally tally;
    for (unsigned seed = 1; seed <= 120; ++seed) {
        const scenarios::Campaign campaign = scenarios::make(scenarios::Sort::small, seed);
        scenarios::score(campaign, interpret(campaign.input), tally);
    }
    const auto percent = [](int part, int all) { return 100.0 * part / all; };
    CAPTURE(tally.shares, tally.over3, tally.one3, tally.false_inflows);
    CHECK(percent(tally.over3_found, tally.over3) >= 99.0);
    CHECK(percent(tally.one3_found, tally.one3) >= 90.0);
    CHECK(percent(tally.shares_in, tally.shares) >= 90.0);
    CHECK(percent(tally.shares_in, tally.shares) <= 99.5);
    CHECK(percent(tally.places_in, tally.places) >= 90.0);
    CHECK(percent(tally.flows_in, tally.flows) >= 90.0);
    CHECK(tally.false_inflows <= 6); // 0.05 a campaign
}

TEST_CASE("a reach into which nothing comes reports nothing", "[stream][property]") {
    scenarios::Tally tally;
    for (unsigned seed = 1001; seed <= 1100; ++seed) {
        const scenarios::Campaign campaign = scenarios::make(scenarios::Sort::small, seed, false);
        scenarios::score(campaign, interpret(campaign.input), tally);
    }
    CHECK(tally.campaigns_with_false < 5); // fewer than 0.05 of 100 campaigns
}

// SPDX-License-Identifier: Apache-2.0
#include "stream/chain.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand;
using namespace rillstrand::stream;

namespace {

struct Findings {
    std::vector<Inflow> inflows;
    std::vector<Gain> gains;
    std::vector<std::size_t> owner;
    void add(double at_m, double share, double place_sd_m, Kind kind = Kind::step) {
        Inflow inflow;
        inflow.kind = kind;
        inflow.fibre_m = 100.0 + at_m;
        inflow.fibre_sd_m = place_sd_m;
        inflow.fraction = share;
        if (kind == Kind::step) {
            gains.push_back({at_m, at_m, -std::log(1.0 - share), 0.001});
            owner.push_back(inflows.size());
        }
        inflows.push_back(inflow);
    }
};

Frame frame_from_100() {
    Frame frame;
    frame.origin_m = 100.0;
    frame.sign = 1.0;
    return frame;
}

} // namespace

TEST_CASE("small steps without a place of their own are one gaining stretch", "[stream]") {
    Findings f;
    f.add(20.0, 0.05, 0.1); // a true step before it
    f.add(35.0, 0.0, 0.1, Kind::spot);
    f.add(100.0, 0.01, 2.0);
    f.add(120.0, 0.012, 1.5);
    f.add(140.0, 0.008, 1.0);
    f.add(200.0, 0.03, 0.1);
    join_chains(frame_from_100(), f.inflows, f.gains, f.owner);
    REQUIRE(f.inflows.size() == 4);
    REQUIRE(f.gains.size() == 3);
    const Inflow& gain = f.inflows[f.owner[2]];
    CHECK(gain.kind == Kind::diffuse);
    CHECK(gain.fibre_from_m == Approx(190.0));
    CHECK(gain.fibre_to_m == Approx(250.0));
    CHECK(gain.fraction == Approx(1.0 - 0.99 * 0.988 * 0.992));
    CHECK(f.gains[2].log_gain_sd == Approx(0.001 * std::sqrt(3.0)));
    CHECK(f.inflows[f.owner[1]].fraction == 0.03);
    CHECK(f.inflows[f.owner[0]].fraction == 0.05);
}

TEST_CASE("steps with a place of their own, too few or one that outweighs stay steps", "[stream]") {
    for (const int which : {0, 1, 2}) {
        Findings f;
        f.add(100.0, 0.01, which == 0 ? 0.1 : 2.0);
        f.add(120.0, which == 2 ? 0.05 : 0.012, 1.5);
        if (which != 1)
            f.add(140.0, 0.008, 1.0);
        const std::size_t before = f.inflows.size();
        join_chains(frame_from_100(), f.inflows, f.gains, f.owner);
        CHECK(f.inflows.size() == before);
        CHECK(f.inflows.front().kind == Kind::step);
    }
}

// SPDX-License-Identifier: Apache-2.0
#include "quality/events.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>
#include <numbers>
#include <random>

using namespace rillstrand;

namespace {

constexpr Eigen::Index n_time = 288; // three days of a quarter of an hour
constexpr Eigen::Index n_place = 300;

/// A stream with a day's wave, an inflow of groundwater at channel 180, white noise.
struct Stream {
    record::Axes axes;
    Eigen::ArrayXXf degC{n_time, n_place};
    std::vector<std::string> setting = std::vector<std::string>(n_place, "streambed");
    std::vector<std::string> stretch = std::vector<std::string>(n_place, "reach");

    explicit Stream(unsigned seed) {
        axes.interval_s = 900.0;
        axes.time_s = Eigen::ArrayXd::LinSpaced(n_time, 2e9, 2e9 + 900.0 * (n_time - 1));
        axes.distance_m = Eigen::ArrayXd::LinSpaced(n_place, 0.0, n_place - 1.0);
        std::mt19937_64 chance{seed};
        std::normal_distribution<double> noise{0.0, 0.05};
        for (Eigen::Index i = 0; i < n_time; ++i) {
            const double water = at(i, 3.0);
            for (Eigen::Index j = 0; j < n_place; ++j) {
                const double here = j < 180 ? water : water + 0.1 * (9.0 - water);
                degC(i, j) = static_cast<float>(here + noise(chance));
            }
        }
    }
    double at(Eigen::Index i, double amplitude_K) const {
        return 14.0 +
               amplitude_K * std::cos(2.0 * std::numbers::pi * static_cast<double>(i) / 96.0);
    }
    std::vector<quality::Event> events() const {
        const record::MemorySource source{axes, degC};
        NoProgress progress;
        const auto scan = record::scan(source, {}, progress);
        return quality::find_events({source, scan, setting, stretch, 1.0}, progress);
    }
};

/// One event of the kind, at the place and time given (NaN: not asked), and no other event.
bool named(const std::vector<quality::Event>& events, const char* kind, double fibre_m,
           double at_s) {
    return events.size() == 1 && events[0].kind == kind &&
           (std::isnan(fibre_m) ||
            (events[0].from_m - 2.0 <= fibre_m && fibre_m <= events[0].to_m + 2.0)) &&
           (std::isnan(at_s) || (events[0].from_s <= at_s && at_s <= events[0].to_s));
}

constexpr double any = std::numeric_limits<double>::quiet_NaN();
constexpr float missing = std::numeric_limits<float>::quiet_NaN();

} // namespace

TEST_CASE("a clean stream with an inflow has no events", "[quality][property]") {
    int alarms = 0;
    for (unsigned seed = 0; seed < 60; ++seed)
        alarms += Stream{seed}.events().empty() ? 0 : 1;
    CHECK(alarms <= 2);
}

TEST_CASE("planted faults are named at their place", "[quality][property]") {
    constexpr int records = 20;
    int dead = 0, stuck = 0, noisy = 0, exposed = 0, splice = 0, clock = 0, dropout = 0, jump = 0,
        trace = 0, spike = 0;
    for (unsigned seed = 100; seed < 100 + records; ++seed) {
        std::mt19937_64 chance{seed};
        const auto place = static_cast<Eigen::Index>(40 + chance() % 100);
        const auto time = static_cast<Eigen::Index>(30 + chance() % 200);
        const double at_m = static_cast<double>(place);
        const Stream clean{seed};
        const double at_s = clean.axes.time_s(time);

        Stream s = clean;
        s.degC.middleCols(place, 5) = missing;
        dead += named(s.events(), "dead", at_m + 2.0, any);

        s = clean;
        s.degC.middleCols(place, 2) = 12.5F;
        stuck += named(s.events(), "stuck", at_m, any);

        s = clean;
        std::normal_distribution<float> loud{0.0F, 1.0F};
        for (Eigen::Index i = 0; i < n_time; ++i)
            s.degC(i, place) += loud(chance);
        noisy += named(s.events(), "noisy", at_m, any);

        s = clean; // out of the water: more than twice the swing, on four metres
        for (Eigen::Index i = 0; i < n_time; ++i)
            s.degC.row(i).segment(place, 4) += static_cast<float>(s.at(i, 4.0) - 14.0);
        exposed += named(s.events(), "exposed", at_m + 1.0, any);

        s = clean;
        s.degC.rightCols(n_place - place) += 0.4F;
        splice += named(s.events(), "splice", at_m, any);

        s = clean;
        s.axes.time_s.tail(n_time - time) += 400.0;
        clock += named(s.events(), "clock", any, at_s);

        s = clean;
        s.degC.middleRows(time, 3) = missing;
        dropout += named(s.events(), "dropout", any, at_s);

        s = clean;
        s.degC.bottomRows(n_time - time) += 0.8F;
        jump += named(s.events(), "jump", any, at_s);

        s = clean;
        s.degC.row(time) -= 1.0F;
        trace += named(s.events(), "trace", any, at_s);

        s = clean;
        s.degC(time, place) += 3.0F;
        spike += named(s.events(), "spike", at_m, at_s);
    }
    for (const int found :
         {dead, stuck, noisy, exposed, splice, clock, dropout, jump, trace, spike})
        CHECK(found >= 19);
}

TEST_CASE("a record too short for events has none and does no harm", "[quality]") {
    Stream s{1};
    s.axes.time_s.conservativeResize(1);
    s.degC.conservativeResize(1, n_place);
    CHECK(s.events().empty());
}

// SPDX-License-Identifier: Apache-2.0
#include "stream/regime.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>

using namespace rillstrand::stream;

namespace {
// Worked example of checks by hand: ten daily maxima, degC.
Eigen::ArrayXd ten_days() {
    Eigen::ArrayXd daily(10);
    daily << 17.2, 17.9, 18.4, 18.8, 19.1, 18.6, 17.8, 17.0, 16.5, 18.2;
    return daily;
}
} // namespace

TEST_CASE("seven-day means of daily maxima match the worked series", "[stream]") {
    const Eigen::ArrayXd means = seven_day_means(ten_days());
    const double printed_digit = 5e-7;
    REQUIRE(means.size() == 4);
    CHECK(means[0] == Approx(18.257143).margin(printed_digit));
    CHECK(means[1] == Approx(18.228571).margin(printed_digit));
    CHECK(means[2] == Approx(18.028571).margin(printed_digit));
    CHECK(means[3] == Approx(18.000000).margin(printed_digit));
    CHECK_FALSE(means[3] > 18.0 + 1e-12); // the criterion is 'exceeds'
}

TEST_CASE("the greatest seven-day mean needs seven full days in a row", "[stream]") {
    const Eigen::ArrayXd daily = ten_days();
    const Eigen::Index n = 240;
    Eigen::ArrayXd time(n), value(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        time[i] = 3600.0 * (double(i) + 0.5);
        value[i] = i % 24 == 15 ? daily[i / 24] : daily[i / 24] - 4.0;
    }
    CHECK(seven_day_maximum_degC(time, 3600.0, value, 0.0) == Approx(18.257143).margin(5e-7));
    SECTION("six days have none") {
        CHECK(std::isnan(seven_day_maximum_degC(time.head(144), 3600.0, value.head(144), 0.0)));
    }
    SECTION("a window with a missing day yields no value, not a shorter mean") {
        value.segment(4 * 24, 6).setConstant(std::numeric_limits<double>::quiet_NaN());
        CHECK(std::isnan(seven_day_maximum_degC(time, 3600.0, value, 0.0)));
    }
    SECTION("hours above are counted strictly") {
        Eigen::ArrayXd four(4);
        four << 18.0, 18.1, 17.0, std::numeric_limits<double>::quiet_NaN();
        CHECK(hours_above(four, 18.0, 1800.0) == Approx(0.5));
    }
}

// SPDX-License-Identifier: Apache-2.0
#include "gather_helpers.hpp"

#include "record/side_series.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand;
using namespace rillstrand::testing;
using Catch::Matchers::Contains;

namespace {
record::SideValues read(const std::string& content, const std::string& column,
                        const std::string& zone = "Etc/UTC") {
    const fs::path folder = fresh_folder("side");
    put(folder / "s.csv", content);
    campaign::Record options;
    options.time_zone = zone;
    return record::read_side_series({folder / "s.csv", column, {}}, options);
}
} // namespace

TEST_CASE("a logger's series is read, sorted and cleaned of missing values", "[record]") {
    const auto series = read("time;t_c;x\n1970-01-01T00:20:00;3,5;1\n1970-01-01T00:00:00;1,5;1\n"
                             "1970-01-01T00:10:00;;1\n",
                             "t_c");
    REQUIRE(series.time_s.size() == 2);
    CHECK(series.time_s(1) == 1200.0);
    CHECK(series.value(0) == 1.5);
    CHECK(series.value(1) == 3.5);
    REQUIRE(series.warnings.size() == 1);
    CHECK(series.warnings[0].code == "series-time-backwards");
}

TEST_CASE("a series without offsets is in the record's zone", "[record]") {
    CHECK(read("time,a\n1970-07-01T02:00:00,1\n", "a", "Etc/GMT-2").time_s(0) == 181.0 * 86400.0);
}

TEST_CASE("a series that cannot be read is named", "[record]") {
    CHECK_THROWS_WITH(read("time,a\n1970-01-01T00:00:00Z,1\n", "b"),
                      Contains("there is no column 'b'; the columns are 'time', 'a'"));
    CHECK_THROWS_WITH(read("time,a\n1970-01-01T00:00:00Z,one\n", "a"),
                      Contains("s.csv:2: a is 'one', which is no number"));
    CHECK_THROWS_WITH(read("time,a\nyesterday,1\n", "a"), Contains("s.csv:2: time 'yesterday'"));
    CHECK_THROWS_WITH(read("time,a\n1970-01-01T00:00:00Z,1\n1970-01-01T00:00:00Z,2\n", "a"),
                      Contains("has two values at 1970-01-01T00:00:00Z"));
}

TEST_CASE("means over intervals are areas under the line", "[record]") {
    record::SideValues series;
    series.time_s = Eigen::ArrayXd::LinSpaced(11, 0.0, 100.0);
    series.value = series.time_s * 0.1; // a straight line: its mean is its middle
    Eigen::ArrayXd times_s(3);
    times_s << 50.0, 97.0, 30.0;
    const Eigen::ArrayXd means = record::mean_over_intervals(series, times_s, 25.0, 3600.0);
    CHECK(means(0) == Approx(5.0));
    CHECK(means(1) == Approx(9.7)); // the interval's end is not covered: the value at its middle
    CHECK(means(2) == Approx(3.0));
    Eigen::ArrayXd outside(1);
    outside << 200.0;
    CHECK(std::isnan(record::mean_over_intervals(series, outside, 25.0, 3600.0)(0)));
    CHECK(std::isnan(record::mean_over_intervals(series, times_s, 0.0, 5.0)(1)));
}

TEST_CASE("words and numbers for 'missing' hold for a series too", "[record][bug]") {
    const auto series = read("time,a\n1970-01-01T00:00:00Z,5\n1970-01-01T00:10:00Z,-9999\n"
                             "1970-01-01T00:20:00Z,NA\n1970-01-01T00:30:00Z,6\n",
                             "a");
    REQUIRE(series.value.size() == 2);
    CHECK(series.value(1) == 6.0);
}

TEST_CASE("a series between blanks may have blanks in its stamps", "[record]") {
    const auto series = read("time a\n1970-01-01 00:00:00 5\n1970-01-01 00:10:00 6\n", "a");
    CHECK(series.time_s(1) == 600.0);
    CHECK(series.value(1) == 6.0);
}

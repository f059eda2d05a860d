// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"

#include <catch2/catch.hpp>

#include <limits>

using namespace rillstrand;

TEST_CASE("slug turns every run of other characters into one underscore", "[base]") {
    CHECK(text::slug("Rod 1") == "rod_1");
    CHECK(text::slug("mast -- (north)") == "mast_north_");
    CHECK(text::slug("../../etc") == "_etc");
}

TEST_CASE("numbers are parsed whole or not at all", "[base]") {
    CHECK(text::parse_number(" +12.5 ") == 12.5);
    CHECK_FALSE(text::parse_number("12.5x"));
    CHECK_FALSE(text::parse_number("1,5"));
    CHECK_FALSE(text::parse_number("+-1"));
    CHECK_FALSE(text::parse_number("inf"));
    CHECK_FALSE(text::parse_number(""));
}

TEST_CASE("fixed notation carries no negative zero", "[base]") {
    CHECK(text::fixed(-0.0004, 3) == "0.000");
    CHECK(text::fixed(-0.0006, 3) == "-0.001");
}

TEST_CASE("times are ISO 8601 in UTC", "[base]") {
    CHECK(text::iso_time(0.0) == "1970-01-01T00:00:00Z");
    CHECK(text::iso_time(1.5) == "1970-01-01T00:00:01.500Z");
    CHECK(text::iso_time(-1.0) == "1969-12-31T23:59:59Z");
    CHECK(text::iso_time(951782400.0) == "2000-02-29T00:00:00Z");
    CHECK(text::iso_time(std::numeric_limits<double>::quiet_NaN()).empty());
}

TEST_CASE("a misspelt word finds the nearest known one", "[base]") {
    CHECK(text::nearest("turnarond_m", {"turnaround_m", "max_slack"}) == "turnaround_m");
    CHECK(text::nearest("zzzzzz", {"turnaround_m", "max_slack"}).empty());
    CHECK(text::edit_distance("form_m", "from_m") == 1);
}

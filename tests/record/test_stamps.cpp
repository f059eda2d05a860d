// SPDX-License-Identifier: Apache-2.0
#include "record/stamps.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <catch2/catch.hpp>

#include <string>
#include <vector>

using namespace rillstrand;
using Catch::Matchers::Contains;

namespace {

campaign::Record in_zone(const std::string& zone) {
    campaign::Record record;
    record.time_zone = zone;
    return record;
}

/// UTC of stamps that follow each other.
std::vector<std::string> utc(const std::string& zone, const std::vector<std::string>& stamps) {
    const record::StampReader reader{in_zone(zone)};
    record::ClockSequence sequence{reader};
    std::vector<std::string> times;
    std::size_t line = 1;
    for (const auto& stamp : stamps)
        times.push_back(text::iso_time(sequence.next(reader.read(stamp), stamp, "a.csv", ++line)));
    sequence.finish();
    return times;
}

/// Every `minutes` of the local clock from a first to a last hour of a day.
void add_hours(std::vector<std::string>& stamps, const std::string& day, int from, int to,
               int minutes) {
    for (int at = from * 60; at < to * 60; at += minutes) {
        const std::string hour = std::to_string(at / 60), minute = std::to_string(at % 60);
        stamps.push_back(day + "T" + (hour.size() < 2 ? "0" : "") + hour + ":" +
                         (minute.size() < 2 ? "0" : "") + minute);
    }
}

} // namespace

TEST_CASE("time forms are read part by part", "[record]") {
    struct Case {
        const char* form;
        const char* stamp;
        const char* expected; ///< the clock, or UTC where an offset is written; empty: no fit
    };
    const auto c = GENERATE(
        values<Case>({{"%d.%m.%Y %H:%M:%S", "05.04.2031 06:07:08", "2031-04-05T06:07:08Z"},
                      {"%d.%m.%Y %H:%M:%S", "5.4.2031  6:07:08.25", "2031-04-05T06:07:08.250Z"},
                      {"%d.%m.%Y %H:%M:%S", "05.04.2031 06:07", ""},
                      {"%d.%m.%Y %H:%M", "05.04.2031 06:07:08", ""},
                      {"%d.%m.%Y %H:%M", "31.04.2031 06:07", ""},
                      {"%d.%m.%Y %H:%M", "05.04.2031 25:07", ""},
                      {"%m/%d/%y %I:%M %p", "04/05/31 12:07 am", "2031-04-05T00:07:00Z"},
                      {"%m/%d/%y %I:%M %p", "04/05/31 01:07 PM", "2031-04-05T13:07:00Z"},
                      {"%m/%d/%y %I:%M %p", "04/05/31 13:07 PM", ""},
                      {"%D %R", "04/05/69 01:02", "1969-04-05T01:02:00Z"},
                      {"%Y%j%H%M", "20310951020", "2031-04-05T10:20:00Z"},
                      {"%Y %j %H", "2032 366 1", "2032-12-31T01:00:00Z"},
                      {"%Y %j %H", "2031 366 1", ""},
                      {"%d-%b-%Y %T", "05-APR-2031 06:07:08", "2031-04-05T06:07:08Z"},
                      {"%A %d %B %Y %T", "Saturday 05 April 2031 06:07:08", "2031-04-05T06:07:08Z"},
                      {"%FT%T%z", "2031-04-05T06:07:08+0230", "2031-04-05T03:37:08Z"},
                      {"%s", "1000000000", "2001-09-09T01:46:40Z"},
                      {"100%% %F %R", "100% 2031-04-05 06:07", "2031-04-05T06:07:00Z"}}));
    INFO(c.form << " " << c.stamp);
    const auto found = record::TimeFormat{c.form}.parse(c.stamp);
    CHECK((found ? text::iso_time(found->clock_s - found->offset_s.value_or(0.0)) : "") ==
          c.expected);
}

TEST_CASE("time forms that cannot be meant are refused by name", "[record]") {
    const auto [form, expected] = GENERATE(table<std::string, std::string>(
        {{"%d.%m.%Y %Q", "time form '%d.%m.%Y %Q': '%Q' is not known"},
         {"%H:%M", "time form '%H:%M' does not tell the year"},
         {"%Y %H", "time form '%Y %H' does not tell the day"},
         {"%Y-%m-%d", "time form '%Y-%m-%d' does not tell the hour"},
         {"%F %I:%M", "does not tell the half of the day"},
         {"%F %H:%H", "'%H' stands twice"},
         {"%F %R %", "ends in a lone %"}}));
    CHECK_THROWS_WITH(record::TimeFormat{form}, Contains(expected));
}

TEST_CASE("a stamp in a file's name may stand amid other words", "[record]") {
    campaign::Record options;
    options.text.time_from_name = "%Y%m%d_%H%M%S";
    const record::StampReader reader{options};
    const double expected_s = record::parse_iso("2031-04-05T06:07:08")->clock_s;
    for (const char* name : {"20310405_060708", "20310405_060708.csv", "ch1_20310405_060708-x.csv"})
        CHECK(reader.read_name(name).clock_s == expected_s);
    CHECK_THROWS_WITH(reader.read_name("20310405_060708_20310405_060709.csv"),
                      Contains("the name does not hold one time of the form '%Y%m%d_%H%M%S'"));
    CHECK_THROWS_WITH(reader.read_name("1203104055_060708.csv"), Contains("does not hold one"));
}

TEST_CASE("ISO 8601 is read in its usual forms", "[record]") {
    const double expected_s = record::parse_iso("2031-04-05T06:07:00")->clock_s;
    for (const char* same : {"2031-04-05 06:07", "2031-04-05T08:07+02:00", "2031-04-05T08:07+02",
                             "20310405T060700Z", "20310405T0607", "2031-04-05  06:07:00.000 Z",
                             "2031-04-05T06:06:60", "\"2031-04-05T06:07:00\""}) {
        INFO(same);
        const auto found = record::parse_iso(same);
        REQUIRE(found);
        CHECK(found->clock_s - found->offset_s.value_or(0.0) == expected_s);
    }
    for (const char* other :
         {"2031-04-05", "2031-02-29T00:00", "2031-04-05T24:01", "2031-4-5T00:00",
          "2031-04-05T06:07:61", "2031-04-05T06:07x", "20310405060700", ""}) {
        INFO(other);
        CHECK_FALSE(record::parse_iso(other));
    }
}

// Directive 2000/84/EC: summer time from the last Sunday of March to the last Sunday of October,
// both at 01:00 UTC. Energy Policy Act of 2005 (USA), section 110: from the second Sunday of March
// to the first Sunday of November, at 2 o'clock local time. The Sundays are the calendar's.
TEST_CASE("zones follow their rules beyond the zone database", "[record][published][bug]") {
    const auto [zone, stamp, expected] = GENERATE(table<std::string, std::string, std::string>(
        {{"Europe/Berlin", "2031-07-01T12:00", "2031-07-01T10:00:00Z"},
         {"Europe/Berlin", "2045-07-01T12:00", "2045-07-01T10:00:00Z"},
         {"Europe/Berlin", "2045-01-01T12:00", "2045-01-01T11:00:00Z"},
         {"Europe/Berlin", "2045-03-26T01:59", "2045-03-26T00:59:00Z"},
         {"Europe/Berlin", "2045-03-26T03:00", "2045-03-26T01:00:00Z"},
         {"Europe/Berlin", "2099-10-25T03:00", "2099-10-25T02:00:00Z"},
         {"Europe/Berlin", "2099-10-25T01:59", "2099-10-24T23:59:00Z"},
         {"America/New_York", "2046-03-11T03:00", "2046-03-11T07:00:00Z"},
         {"America/New_York", "2046-03-11T01:59", "2046-03-11T06:59:00Z"},
         {"America/New_York", "2100-07-04T12:00", "2100-07-04T16:00:00Z"},
         {"Australia/Sydney", "2060-01-01T12:00", "2060-01-01T01:00:00Z"},
         {"Australia/Sydney", "2060-07-01T12:00", "2060-07-01T02:00:00Z"},
         {"Asia/Kolkata", "2060-07-01T12:00", "2060-07-01T06:30:00Z"}}));
    INFO(zone << " " << stamp);
    CHECK(utc(zone, {stamp}) == std::vector<std::string>{expected});
}

TEST_CASE("a repeated hour is read by the order of the stamps", "[record]") {
    const auto [zone, day, hour, first_utc_hour] =
        GENERATE(table<std::string, std::string, int, std::string>(
            {{"Europe/Berlin", "2031-10-26", 2, "2031-10-26T00:"},
             {"America/New_York", "2031-11-02", 1, "2031-11-02T05:"}}));
    INFO(zone);
    std::vector<std::string> stamps;
    add_hours(stamps, day, hour - 1, hour + 1, 20);
    add_hours(stamps, day, hour, hour + 2, 20);
    const auto times = utc(zone, stamps);
    for (std::size_t i = 1; i < times.size(); ++i)
        CHECK(record::parse_iso(times[i])->clock_s - record::parse_iso(times[i - 1])->clock_s ==
              1200.0);
    CHECK(times[3].substr(0, 14) == first_utc_hour);
}

TEST_CASE("a record that ends or begins in the first pass of a repeated hour is read", "[record]") {
    std::vector<std::string> ends;
    add_hours(ends, "2031-10-26", 1, 3, 30);
    CHECK(utc("Europe/Berlin", ends).back() == "2031-10-26T00:30:00Z");
    std::vector<std::string> begins{"2031-10-26T02:40"};
    add_hours(begins, "2031-10-26", 2, 4, 20);
    CHECK(utc("Europe/Berlin", begins).front() == "2031-10-26T00:40:00Z");
    CHECK(utc("Europe/Berlin", begins)[1] == "2031-10-26T01:00:00Z");
}

TEST_CASE("a repeated hour that nothing tells is refused by name", "[record]") {
    CHECK_THROWS_WITH(
        utc("Europe/Berlin", {"2031-10-26T02:10", "2031-10-26T02:20"}),
        "a.csv:2: time '2031-10-26T02:10' stands twice in Europe/Berlin, where clocks "
        "were put back, and no stamp around it tells which is meant; give stamps with "
        "an offset or leave this part out");
    std::vector<std::string> never_back;
    add_hours(never_back, "2031-10-26", 1, 4, 20);
    CHECK_THROWS_WITH(utc("Europe/Berlin", never_back),
                      "a.csv:5: time '2031-10-26T02:00' and those after it stand once, without a "
                      "pause, though clocks were put back over them in Europe/Berlin; set "
                      "record.time_zone to the zone that the clock really kept, such as Etc/UTC or "
                      "Etc/GMT-1");
    std::vector<std::string> thrice;
    for (int i = 0; i < 3; ++i)
        add_hours(thrice, "2031-10-26", 2, 3, 20);
    CHECK_THROWS_WITH(utc("Europe/Berlin", thrice),
                      Contains("a.csv:8: time '2031-10-26T02:00' goes "
                               "back a second time in the hour"));
    CHECK_THROWS_WITH(utc("America/New_York", {"2031-03-09T01:30", "2031-03-09T02:30"}),
                      Contains("a.csv:3: time '2031-03-09T02:30' does not exist in "
                               "America/New_York"));
}

// SPDX-License-Identifier: Apache-2.0
#include "gather_helpers.hpp"

#include "base/text.hpp"
#include "record/decimal.hpp"

#include <catch2/catch.hpp>

#include <charconv>
#include <random>

using namespace rillstrand;
using namespace rillstrand::testing;
using Catch::Matchers::Contains;

TEST_CASE("bombs are refused with the limit named", "[record]") {
    const fs::path folder = fresh_folder("bombs");
    campaign::Record options;
    options.files = {"a*"};
    std::string wide = "time";
    for (int i = 0; i < 1000001; ++i)
        wide += "," + std::to_string(i);
    put(folder / "a.csv", wide + "\n2031-01-01T00:00:00Z,1\n");
    CHECK(refusal(folder, options) == "a.csv:1: has over 1000000 columns; this is no trace table");
    put(folder / "a.csv", "time,1\n" + std::string((std::size_t{66} << 20U), '7'));
    CHECK(refusal(folder, options) ==
          "a.csv: a line is longer than 64 MB; this is no table of text");
    fs::remove(folder / "a.csv");
    gzFile file = gzopen((folder / "a.gz").c_str(), "wb9");
    const std::string blank(std::size_t{1} << 20U, '\n');
    gzwrite(file, "time,1\n2031-01-01T00:00:00Z,1\n", 30);
    for (int i = 0; i < 300; ++i)
        gzwrite(file, blank.data(), static_cast<unsigned>(blank.size()));
    gzclose(file);
    CHECK(refusal(folder, options) == "a.gz: unpacks to more than 300 times its size, as no table "
                                      "of measured numbers does; check what the file is");
}

TEST_CASE("what is no whole text file is refused by name", "[record]") {
    const fs::path folder = fresh_folder("no_text");
    const std::string text = "time,1,2\n2031-01-01T00:00:00Z,1,2\n";
    std::ofstream{folder / "a.csv", std::ios::binary} << std::string("\xFF\xFEt\0", 4);
    CHECK(refusal(folder, {}) == "a.csv: is text in UTF-16; save it as UTF-8");
    put_gzip(folder / "a.csv", text);
    {
        std::ofstream out{folder / "a.csv", std::ios::binary | std::ios::app};
        out << "more";
    }
    CHECK(refusal(folder, {}) ==
          "a.csv: bytes that are no gzip follow the gzip stream; copy the file again");
    put_gzip(folder / "a.csv", text);
    put_gzip(folder / "b", "2031-01-01T00:05:00Z,3,4\n");
    {
        std::ifstream second{folder / "b", std::ios::binary};
        std::ofstream out{folder / "a.csv", std::ios::binary | std::ios::app};
        out << second.rdbuf() << std::string(7, '\0'); // a second stream, padded
    }
    KeepSink sink;
    campaign::Record options;
    options.files = {"a.csv"};
    gather(options, folder, sink);
    CHECK(sink.times_s.size() == 2);
    fs::remove(folder / "b");
    CHECK(std::distance(fs::directory_iterator{folder}, fs::directory_iterator{}) == 1);
}

TEST_CASE("a comma that parts cells and decimals is refused by name", "[record]") {
    const fs::path folder = fresh_folder("two_commas");
    put(folder / "a.csv", "# 2031-01-01T00:00:00Z\ndistance,temperature\n0,5,10,25\n1,0,10,5\n");
    CHECK(refusal(folder, {}) ==
          "a.csv:3: has twice as many cells as the header names columns: the comma seems to be "
          "decimal mark and delimiter at once; write another delimiter, such as ;");
    put(folder / "a.csv", "time;1;2\n2031-01-01T00:00:00Z;10.5;11\n2031-01-01T00:05:00Z;10,5;11\n");
    campaign::Record options;
    options.text.decimal = '.';
    CHECK(refusal(folder, options) ==
          "a.csv:3: column 2: '10,5' is no temperature; the decimal mark is taken for a point, see "
          "record.text.decimal");
}

TEST_CASE("the decimal mark is told from any row, a header from any line", "[record][bug]") {
    const fs::path folder = fresh_folder("told");
    campaign::Record options;
    options.files = {"a.csv"};
    put(folder / "a.csv", "some words; more\nmade by: hand\nTime;1 m;2 m\n"
                          "2031-01-01T00:00:00Z;10;11\n2031-01-01T00:05:00Z;10,5;11\n");
    KeepSink comma;
    gather(options, folder, comma);
    CHECK(comma.temperature_degC[1](0) == 10.5F);
    put(folder / "a.csv", "time 1 2\n2031-01-01 00:00:00 10 11\n2031-01-01 00:05:00 10 NA\n");
    KeepSink blanks;
    gather(options, folder, blanks);
    CHECK(blanks.times_s[1] - blanks.times_s[0] == 300.0);
    CHECK(std::isnan(blanks.temperature_degC[1](1)));
    put(folder / "a.csv", "when,2,1\n2031-01-01T00:00:00Z,20,10\n");
    KeepSink reversed;
    const auto report = gather(options, folder, reversed).first;
    CHECK(reversed.head.distance_m(0) == 1.0);
    CHECK(reversed.temperature_degC[0](0) == 10.0F);
    CHECK(std::count_if(report.warnings.begin(), report.warnings.end(), [](const Warning& w) {
              return w.code == "record-distances-reversed";
          }) == 1);
}

TEST_CASE("a mean of traces takes each value over the traces that have it", "[record][bug]") {
    const fs::path folder = fresh_folder("mean_missing");
    put(folder / "a.csv", "time,1,2\n2031-01-01T00:00:00Z,nan,1\n2031-01-01T00:00:00Z,2,1\n"
                          "2031-01-01T00:00:00Z,6,1\n2031-01-01T00:00:00Z,2,1\n");
    campaign::Record options;
    options.files = {"a.csv"};
    options.duplicates = campaign::Duplicates::mean;
    KeepSink sink;
    gather(options, folder, sink);
    CHECK(sink.temperature_degC[0](0) == 4.0F);
}

TEST_CASE("gzip tables in disorder leave nothing behind", "[record][bug]") {
    const fs::path folder = fresh_folder("gzip_disorder");
    put_gzip(folder / "a.gz", "time,1,2\n2031-01-01T00:05:00Z,3,4\n2031-01-01T00:00:00Z,1,2\n");
    put_gzip(folder / "b.gz", "time,1,2\n2031-01-01T00:02:00Z,5,6\n");
    campaign::Record options;
    options.files = {"*.gz"};
    KeepSink sink;
    gather(options, folder, sink);
    REQUIRE(sink.times_s.size() == 3);
    CHECK(sink.temperature_degC[0](0) == 1.0F);
    CHECK(sink.temperature_degC[1](0) == 5.0F);
    CHECK(sink.temperature_degC[2](0) == 3.0F);
    CHECK(std::distance(fs::directory_iterator{folder}, fs::directory_iterator{}) == 2);
}

// std::from_chars rounds correctly (C++20, [charconv.from.chars]).
TEST_CASE("plain decimals are the numbers that from_chars gives", "[record][property]") {
    std::mt19937_64 random{31};
    for (int i = 0; i < 200000; ++i) {
        std::string text = random() % 2U == 0 ? "-" : "";
        text += std::to_string(random() % (std::uint64_t{1} << (random() % 40U)));
        if (random() % 4U != 0)
            text += "." + std::to_string(random() % (std::uint64_t{1} << (random() % 30U)));
        double expected = 0.0, value = 0.0;
        std::from_chars(text.data(), text.data() + text.size(), expected);
        const char* at = text.data();
        if (record::take_decimal(at, text.data() + text.size(), '.', value)) {
            CHECK(value == expected);
            CHECK(at == text.data() + text.size());
        }
    }
    for (const std::string text : {"", "-", ".", "+-3", "x1", "--1"}) {
        double value = 7.0;
        const char* at = text.data();
        CHECK_FALSE(record::take_decimal(at, text.data() + text.size(), '.', value));
        CHECK(value == 7.0);
    }
}

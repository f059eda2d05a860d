// SPDX-License-Identifier: Apache-2.0
#include "gather_helpers.hpp"

#include "base/text.hpp"
#include "record/distinct.hpp"
#include "record/spill.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <random>
#include <set>

using namespace rillstrand;
using namespace rillstrand::testing;

namespace {

const std::string header = "time,distance,temperature\n";

std::string row(int minute, double distance_m, const std::string& value) {
    return "2031-01-01T00:" + std::string{minute < 10 ? "0" : ""} + std::to_string(minute) +
           ":00Z," + text::number(distance_m) + "," + value + "\n";
}

campaign::Record all_files() {
    campaign::Record options;
    options.files = {"*.csv"};
    return options;
}

} // namespace

TEST_CASE("tall files of other distances are refused unless the campaign says how",
          "[record][bug]") {
    const fs::path folder = fresh_folder("tall_axes");
    put(folder / "a.csv", header + row(0, 1, "10") + row(0, 2, "20"));
    put(folder / "b.csv", header + row(5, 1.1, "11") + row(5, 2.1, "21"));
    CHECK(
        refusal(folder, {}) ==
        "b.csv: has 2 distances from 1.1 to 2.1 m, but a.csv has 2 distances from 1 to 2 m, first "
        "apart at the 1. (1 and 1.1 m); say record.align = \"nearest\" or \"linear\" to bring "
        "them to the first");
    auto options = all_files();
    options.align = campaign::Align::nearest;
    KeepSink sink;
    gather(options, folder, sink);
    REQUIRE(sink.times_s.size() == 2);
    CHECK(sink.temperature_degC[1](0) == 11.0F);
    CHECK(sink.temperature_degC[1](1) == 21.0F);
}

TEST_CASE("a trace that is parted over tall files is put together", "[record]") {
    const fs::path folder = fresh_folder("tall_parted");
    put(folder / "a.csv", header + row(0, 1, "10") + row(0, 2, "20") + row(5, 1, "11"));
    put(folder / "b.csv", header + row(5, 2, "21") + row(9, 1, "12") + row(9, 2, "22"));
    KeepSink sink;
    const auto report = gather(all_files(), folder, sink).first;
    REQUIRE(sink.times_s.size() == 3);
    CHECK(sink.temperature_degC[1](0) == 11.0F);
    CHECK(sink.temperature_degC[1](1) == 21.0F);
    CHECK(report.duplicates == 0);
}

TEST_CASE("a value that stands twice in a tall file is told with both lines", "[record]") {
    const fs::path folder = fresh_folder("tall_twice");
    put(folder / "a.csv", header + row(0, 1, "10") + row(0, 2, "20") + row(0, 1, "13"));
    CHECK(refusal(folder, {}) ==
          "a.csv:4: a value of 2031-01-01T00:00:00Z at 1 m stands here and in line 2 with another "
          "value; take one out, or say record.duplicates = \"first\" or \"mean\"");
    put(folder / "a.csv", header + row(0, 1, "10") + row(0, 2, "20") + row(0, 1, "13") +
                              row(0, 1, "16") + row(0, 2, "20"));
    auto options = all_files();
    options.duplicates = campaign::Duplicates::mean;
    KeepSink mean;
    gather(options, folder, mean);
    CHECK(mean.temperature_degC[0](0) == 13.0F);
    CHECK(mean.temperature_degC[0](1) == 20.0F);
    options.duplicates = campaign::Duplicates::first;
    KeepSink first;
    gather(options, folder, first);
    CHECK(first.temperature_degC[0](0) == 10.0F);
}

TEST_CASE("tall rows in any order give the same record", "[record][property]") {
    std::mt19937 random{77};
    std::vector<std::string> rows;
    for (int minute = 0; minute < 50; ++minute)
        for (int j = 0; j < 40; ++j)
            rows.push_back(row(minute, 0.5 * j, std::to_string((minute * 7 + j * 3) % 50)));
    const fs::path folder = fresh_folder("tall_order");
    std::vector<std::vector<Eigen::ArrayXf>> results;
    for (int round = 0; round < 3; ++round) {
        if (round == 1) // place by place
            std::stable_sort(rows.begin(), rows.end(),
                             [](const std::string& a, const std::string& b) {
                                 return std::stod(a.substr(21)) < std::stod(b.substr(21));
                             });
        if (round == 2)
            std::shuffle(rows.begin(), rows.end(), random);
        std::string text = header;
        for (const auto& line : rows)
            text += line;
        put(folder / "a.csv", text);
        KeepSink sink;
        gather(all_files(), folder, sink);
        REQUIRE(sink.times_s.size() == 50);
        results.push_back(sink.temperature_degC);
    }
    for (int minute = 0; minute < 50; ++minute)
        for (Eigen::Index j = 0; j < 40; ++j)
            for (const auto& result : results)
                CHECK(result[static_cast<std::size_t>(minute)](j) ==
                      static_cast<float>((minute * 7 + static_cast<int>(j) * 3) % 50));
}

TEST_CASE("different numbers are found in whatever order they come", "[record][property]") {
    std::mt19937 random{5};
    record::Distinct distinct;
    std::set<double> expected;
    for (int i = 0; i < 50000; ++i) {
        const double value = static_cast<double>(random() % 9000U) * 0.25;
        distinct.add(value);
        expected.insert(value);
    }
    const auto found = distinct.take();
    CHECK(std::equal(found.begin(), found.end(), expected.begin(), expected.end()));
    record::PlaceFinder places{found};
    for (int i = 0; i < 1000; ++i) {
        const std::size_t at = random() % found.size();
        CHECK(places.find(found[at]) == at);
    }
}

TEST_CASE("rows come back from a scratch file in their order", "[record]") {
    const fs::path folder = fresh_folder("spill");
    constexpr std::uint32_t rows = 4500000; // over the 64 MB that wait in memory
    record::Spill spill{folder, 3, 1};
    for (std::uint32_t i = 0; i < rows; ++i) {
        const auto value = static_cast<float>(i % 1000);
        spill.add(i % 3, {i, i % 7, i % 11}, &value);
    }
    CHECK(fs::is_empty(folder)); // what is spilt has no name
    std::size_t wrong = 0, count = 0;
    for (std::uint32_t b = 0; b < 3; ++b) {
        std::uint32_t next = b;
        spill.each(b, [&](const record::SpillRow& r, const float* value) {
            wrong += r.trace != next || r.place != next % 7 || r.line != next % 11 ||
                     *value != static_cast<float>(next % 1000);
            next += 3;
            ++count;
            return true;
        });
    }
    CHECK(wrong == 0);
    CHECK(count == rows);
}

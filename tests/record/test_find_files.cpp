// SPDX-License-Identifier: Apache-2.0
#include "gather_helpers.hpp"

#include <catch2/catch.hpp>

#include <array>

using namespace rillstrand;
using namespace rillstrand::testing;

TEST_CASE("names fit patterns as in a shell", "[record]") {
    struct Case {
        const char* name;
        const char* pattern;
        bool fits;
    };
    const auto c = GENERATE(values<Case>({{"a.csv", "*.csv", true},
                                          {"a.csv", "*.cs", false},
                                          {"a.csv", "?.csv", true},
                                          {"ab.csv", "?.csv", false},
                                          {"t7.csv", "t[0-9].csv", true},
                                          {"tx.csv", "t[0-9].csv", false},
                                          {"tx.csv", "t[!0-9].csv", true},
                                          {"t].csv", "t[]].csv", true},
                                          {"t[.csv", "t[.csv", true},
                                          {"aXbXc", "a*X*c", true},
                                          {"aaaaaaaaaaaaaaaaaaaab", "a*a*a*a*a*a*c", false},
                                          {".hidden", "*", false},
                                          {".hidden", ".h*", true},
                                          {"", "*", true},
                                          {"a", "", false}}));
    INFO(c.name << " " << c.pattern);
    CHECK(record::matches(c.name, c.pattern) == c.fits);
}

TEST_CASE("a folder's own name is no pattern, and folders are no files", "[record][bug]") {
    const fs::path folder = fresh_folder("find") / "site[1]";
    put(folder / "b/2.csv", "x");
    put(folder / "b/1.csv", "x");
    put(folder / "b/c.csv/inner.txt", "x");
    put(folder / "d[1].csv", "x");
    CHECK(record::find_files({"b/*.csv", "b/1.csv"}, folder) ==
          std::vector<fs::path>{folder / "b/1.csv", folder / "b/2.csv"});
    CHECK(record::find_files({"d[1].csv"}, folder) == std::vector<fs::path>{folder / "d[1].csv"});
    CHECK(record::find_files({"*/2.csv"}, folder) == std::vector<fs::path>{folder / "b/2.csv"});
    CHECK_THROWS_WITH(record::find_files({"e*.csv"}, folder),
                      "record.files: 'e*.csv' matches no file in " + folder.string() +
                          "; correct the pattern or put the files there");
}

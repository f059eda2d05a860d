// SPDX-License-Identifier: Apache-2.0
#include "campaign/read.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <filesystem>
#include <fstream>
#include <random>

namespace fs = std::filesystem;
using namespace rillstrand;
using Catch::Matchers::Contains;

namespace {

/// A folder with every file that the complete campaign names.
fs::path prepared_folder() {
    const fs::path folder = fs::path{RILLSTRAND_SCRATCH} / "campaign_read";
    fs::create_directories(folder);
    for (const char* name :
         {"baths.csv", "tie_points.csv", "cable_marks.csv", "route.geojson", "centreline.gpkg",
          "dem.tif", "canopy.tif", "control.csv", "spring.csv", "q.csv", "met.csv", "mill.csv",
          "air.csv", "level.csv", "hypsograph.csv", "ortho.tif"})
        std::ofstream{folder / name} << "x\n";
    return folder;
}

campaign::Campaign parse(const std::string& text) {
    return campaign::parse_campaign(text, prepared_folder() / "campaign.toml");
}

std::vector<std::string> problems_of(const std::string& text) {
    try {
        parse(text);
    } catch (const DataError& error) {
        return error.problems();
    }
    return {};
}

const std::string smallest = R"([record]
files = ["traces/*.csv"]
[placement]
crs = "EPSG:25832"
tie_points = "tie_points.csv"
[[stretch]]
name = "reach"
setting = "streambed"
from_m = 120
to_m = 1180.0
[[stream]]
stretch = "reach"
)";

std::string complete_text() {
    std::ifstream file{std::string{RILLSTRAND_TEST_DATA} + "/complete.toml"};
    return {std::istreambuf_iterator<char>{file}, {}};
}

} // namespace

TEST_CASE("the smallest useful campaign needs twelve lines", "[campaign]") {
    const campaign::Campaign c = parse(smallest);
    CHECK(c.name == "campaign_read");
    CHECK(c.output == prepared_folder() / "out");
    CHECK(c.record.files == std::vector<std::string>{"traces/*.csv"});
    CHECK(c.stretches.at(0).from_m == 120.0);
    CHECK(c.streams.at(0).flow == campaign::Flow::increasing);
    CHECK_FALSE(c.streams.at(0).inflow_temperature_c);
    CHECK(c.placement->max_slack == 1.12);
    CHECK(c.layers.formats.size() == 2);
    const auto said = [&c](const std::string& key) {
        return std::any_of(c.defaults.begin(), c.defaults.end(),
                           [&key](const auto& item) { return item[0] == key; });
    };
    CHECK(said("record.time_zone"));
    CHECK(said("placement.max_slack"));
    CHECK_FALSE(said("record.files"));
}

TEST_CASE("every key of a complete campaign is taken", "[campaign]") {
    const campaign::Campaign c = parse(complete_text());
    const fs::path folder = prepared_folder();
    CHECK(c.name == "Upper Harrowbeck, summer low flow");
    CHECK(c.creator == "Field office");
    CHECK(c.keywords == std::vector<std::string>{"stream", "groundwater"});
    CHECK(c.record.layout == campaign::Layout::single);
    CHECK(c.record.time_zone == "Europe/Berlin");
    CHECK(c.record.clock_offset_s == -12.5);
    CHECK(c.record.stamp == campaign::Stamp::end);
    CHECK(c.record.interval_s == 300.0);
    CHECK(c.record.duplicates == campaign::Duplicates::mean);
    CHECK(c.record.align == campaign::Align::linear);
    CHECK(c.record.temperature_unit == campaign::TemperatureUnit::kelvin);
    CHECK(c.record.distance_unit == campaign::DistanceUnit::kilometre);
    CHECK(c.record.missing == std::vector<std::string>{"x"});
    CHECK(c.record.valid_range_c == std::array<double, 2>{-40.0, 60.0});
    CHECK(c.record.text.delimiter == ';');
    CHECK(c.record.text.decimal == ',');
    CHECK(c.record.text.skip_lines == 2);
    CHECK(c.record.text.time_from_name == "trace_%Y%m%d_%H%M%S");
    CHECK(c.record.text.stokes_column == "st");
    CHECK(c.record.grid.variable == "tmp");
    CHECK(c.record.grid.reverse_antistokes == "rast");
    REQUIRE(c.stretches.size() == 4);
    CHECK(c.stretches[0].burial_depth_m == 0.05);
    REQUIRE(c.baths.size() == 2);
    CHECK(c.baths[0].temperature_c == 0.0);
    CHECK(c.baths[0].use == campaign::BathUse::adjust);
    CHECK(c.baths[1].probe->column == "warm_c");
    CHECK(c.baths[1].probe->file == folder / "baths.csv");
    CHECK(c.baths[1].use == campaign::BathUse::validate);
    CHECK(c.adjust->method == campaign::AdjustMethod::offset_and_slope);
    CHECK(c.placement->crs == "local");
    CHECK(c.placement->cable_marks == folder / "cable_marks.csv");
    CHECK(c.placement->turnaround_m == 1320.5);
    CHECK(c.placement->raster.at(0).name == "canopy");
    CHECK(c.placement->control->crs == "EPSG:25832");
    REQUIRE(c.marks.size() == 1);
    CHECK(c.marks[0].kind == campaign::MarkKind::warm);
    // 2031-04-05T10:20:00Z, counted by hand: 22374 days after 1970-01-01.
    CHECK(c.marks[0].begin_s == 22374.0 * 86400.0 + 37200.0);
    CHECK(c.marks[0].end_s == c.marks[0].begin_s + 720.0);
    REQUIRE(c.streams.size() == 1);
    CHECK(c.streams[0].flow == campaign::Flow::decreasing);
    CHECK(c.streams[0].inflow_temperature_c == 9.6);
    CHECK(c.streams[0].discharge_at == campaign::DischargeAt::downstream);
    CHECK(c.streams[0].gauging.at(0).discharge_sd_m3s == 0.003);
    CHECK(c.streams[0].weather->shortwave == "sw_wm2");
    CHECK(c.streams[0].regime.hours_above_c == std::vector<double>{18.0, 22.0});
    CHECK(c.streams[0].known.at(0).temperature->column == "t_c");
    CHECK(c.streams[0].known.at(1).temperature_stretch == "reach");
    CHECK(c.snows.at(0).minimum_days == 3.0);
    CHECK(c.columns.at(0).winding->pitch_m == 0.02);
    CHECK(c.columns.at(0).water_level->column == "level_m");
    CHECK(c.columns.at(0).position->at(1) == 5278000.0);
    CHECK(c.beds.at(0).heat_capacity_jm3k == 2.8e6);
    CHECK(c.layers.formats.size() == 7);
    CHECK(c.layers.corridor_m == 5.0);
    CHECK(c.page_background == folder / "ortho.tif");
}

TEST_CASE("an unknown key is named with its place and the nearest known one", "[campaign]") {
    CHECK(
        problems_of(smallest + "flwo = \"increasing\"\n") ==
        std::vector<std::string>{"campaign.toml:13:1: unknown key 'stream.flwo'; the nearest known "
                                 "key is 'flow'"});
}

TEST_CASE("all problems are told together", "[campaign]") {
    const auto problems = problems_of(R"([record]
files = []
stamp = "centre"
interval_s = -5
[[stretch]]
name = "a"
setting = "streambed"
from_m = 200.0
to_m = 100.0
[[snow]]
stretch = "b"
method = "threshold"
swing_below_c = "one"
)");
    REQUIRE(problems.size() == 8);
    CHECK(problems[0] == "campaign.toml:2:1: record.files: names no file; give at least one");
    CHECK(problems[1] ==
          "campaign.toml:3:1: record.stamp: 'centre' is none of its words; write one "
          "of end, middle, start");
    CHECK(problems[2] ==
          "campaign.toml:4:1: record.interval_s: -5 is out of range; give a number over 0");
    CHECK(problems[3] ==
          "campaign.toml:9:1: stretch.to_m: 100 is not beyond from_m = 200; exchange "
          "them or correct one");
    CHECK(problems[4] ==
          "campaign.toml:13:1: snow.swing_below_c: is a text; give a number, without "
          "quotation marks");
    CHECK_THAT(problems[5], Contains("'snow.mean_below_c' is missing"));
    CHECK_THAT(problems[6], Contains("'snow.minimum_days' is missing"));
    CHECK_THAT(problems[7], Contains("[[snow]] names stretch 'b', which there is not"));
}

TEST_CASE("stretches that overlap are refused with both names and the metres", "[campaign]") {
    const auto problems = problems_of(smallest + R"([[stretch]]
name = "pool"
setting = "water"
from_m = 1100.0
to_m = 1300.0
)");
    CHECK(problems ==
          std::vector<std::string>{
              "campaign.toml:13:1: stretch 'pool' overlaps stretch 'reach' (line 6) from 1100 to "
              "1180 "
              "m; part them, only a coil or bath may lie wholly inside another stretch"});
    CHECK(problems_of(smallest + R"([[bath]]
name = "ice"
from_m = 500.0
to_m = 520.0
temperature_c = 0.0
)")
              .empty());
}

TEST_CASE("what stands in place of each other cannot stand together", "[campaign]") {
    const auto problems = problems_of(smallest + R"(inflow_temperature_c = 9.0
inflow_temperature = { file = "spring.csv", column = "t" }
discharge_sd_m3s = 0.1
)");
    REQUIRE(problems.size() == 2);
    CHECK_THAT(problems[0], Contains("stream.inflow_temperature: stands beside "
                                     "'inflow_temperature_c'; keep one of the two"));
    CHECK_THAT(problems[1], Contains("stream.discharge_sd_m3s: stands without discharge_m3s"));
}

TEST_CASE("a file that is no campaign is refused in words", "[campaign]") {
    const fs::path folder = prepared_folder();
    CHECK_THROWS_WITH(campaign::read_campaign(folder / "none.toml"),
                      Contains("there is no such file"));
    CHECK_THROWS_WITH(campaign::read_campaign(folder), Contains("is a folder"));
    CHECK_THAT(problems_of("").at(0), Contains("'record' is missing"));
    CHECK_THAT(problems_of("a = ").at(0), Contains("campaign.toml:1:") && Contains("is not TOML"));
    CHECK_THAT(problems_of("a = " + std::string(100000, '[')).at(0), Contains("nested deeper"));
    CHECK_THAT(problems_of("[record]\nfiles = [\"a\"]\n[placement]\ncrs = \"EPSG:25832\"\n"
                           "tie_points = \"tiepoints.csv\"\n")
                   .at(0),
               Contains("placement.tie_points: there is no file 'tiepoints.csv'"));
}

TEST_CASE("a mark's times need an offset", "[campaign]") {
    const auto problems = problems_of(smallest + R"([[mark]]
kind = "cold"
begin = 2031-04-05T10:20:00
end = 2031-04-05T10:32:00Z
near_m = 1.0
within_m = 1.0
x = 1
y = 1
)");
    REQUIRE(problems.size() == 1);
    CHECK_THAT(problems[0], Contains("mark.begin: has no zone offset; add Z for UTC"));
}

TEST_CASE("a spoilt campaign file gives problems in words and nothing else",
          "[campaign][property]") {
    const std::string whole = complete_text();
    std::mt19937 random{4711};
    int refused = 0;
    for (int i = 0; i < 1500; ++i) {
        std::string spoilt = whole;
        for (int k = 0; k < 3; ++k)
            spoilt[random() % spoilt.size()] = static_cast<char>(random() % 256U);
        if (random() % 4U == 0)
            spoilt.resize(random() % spoilt.size());
        try {
            parse(spoilt);
        } catch (const DataError& error) {
            ++refused;
            CHECK_FALSE(error.problems().empty());
        }
    }
    CHECK(refused > 500);
}

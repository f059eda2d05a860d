// SPDX-License-Identifier: Apache-2.0
#include "helpers.hpp"
#include "store/gather.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <fstream>

using namespace rillstrand;
using namespace rillstrand::testing;
using Catch::Matchers::Contains;
using record::Quantity;

namespace {

constexpr Eigen::Index n_time = 150, n_place = 70;

/// The grids of make_grids.py, made once for all cases of this program.
const fs::path& grids() {
    static const fs::path folder = [] {
        fs::path made = fresh_folder("grids");
        const Said said = python("make_grids.py", made.string());
        INFO(said.text);
        REQUIRE(said.status == 0);
        return made;
    }();
    return folder;
}

Eigen::ArrayXXf truth() {
    Eigen::Array<float, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor> rows(n_time, n_place);
    std::ifstream in{grids() / "values.f32", std::ios::binary};
    in.read(reinterpret_cast<char*>(rows.data()),
            static_cast<std::streamsize>(sizeof(float)) * rows.size());
    REQUIRE(in);
    return rows;
}

Eigen::ArrayXXf read_grid(const store::Grid& grid) {
    Eigen::ArrayXXf all(grid.head().axes.n_time(), grid.head().axes.n_place());
    record::CellCounts counts;
    grid.read(Quantity::temperature, 0, 0, all, counts);
    CHECK(counts.values + counts.missing + counts.out_of_range == all.size());
    return all;
}

campaign::Campaign campaign_of(const std::vector<std::string>& files) {
    campaign::Campaign campaign;
    campaign.folder = grids();
    campaign.record.files = files;
    return campaign;
}

std::string refusal(const std::vector<std::string>& files,
                    const campaign::Record& options = campaign::Record{}) {
    auto campaign = campaign_of(files);
    campaign.record = options;
    campaign.record.files = files;
    NoProgress progress;
    const fs::path target = fs::path{RILLSTRAND_SCRATCH} / "refused.nc";
    try {
        store::gather(campaign, target, "", progress);
    } catch (const DataError& error) {
        CHECK_FALSE(fs::exists(target));
        return error.what();
    }
    return "not refused";
}

} // namespace

TEST_CASE("each form of grid gives the same record, on both paths", "[store][property]") {
    const auto [name, decoded_here] = GENERATE(table<std::string, bool>({
        {"deflate.nc", true},
        {"deflate_turned.nc", true},
        {"no_shuffle.nc", true},
        {"chunked_plain.nc", true},
        {"contiguous.nc", false},
        {"contiguous_turned.nc", false},
        {"checksummed.nc", false},
        {"double.nc", true},
        {"big_endian.nc", false},
        {"packed.nc", true},
        {"packed_float_scale.nc", true},
        {"packed_offset.nc", true},
        {"fill.nc", true},
        {"kelvin.nc", true},
        {"fahrenheit.nc", true},
        {"classic.nc", false},
        {"classic64_turned.nc", false},
        {"falling.nc", true},
        {"falling_turned.nc", true},
        {"kilometres.nc", true},
        {"days.nc", true},
        {"minutes.nc", true},
        {"blosc.zarr", false},
        {"turned.zarr", false},
    }));
    CAPTURE(name);
    const campaign::Record options;
    const store::Grid grid{grids() / name, options};
    const store::Grid general{grids() / name, options, true};
    CHECK(grid.decoded_here() == decoded_here);
    CHECK_FALSE(general.decoded_here());
    const record::Axes& axes = grid.head().axes;
    REQUIRE(axes.n_time() == n_time);
    REQUIRE(axes.n_place() == n_place);
    CHECK(axes.time_s(0) == 1933149600.0);
    CHECK(axes.time_s(149) == 1933149600.0 + 149 * 600.0);
    CHECK(std::abs(axes.distance_m(0) - 10.0) < 1e-9);
    CHECK(std::abs(axes.distance_m(69) - 44.5) < 1e-9);
    CHECK(differing(read_grid(grid), truth()) == 0);
    CHECK(differing(read_grid(general), truth()) == 0);
    // A block from within, and the record as a source.
    const auto source = store::open_grid(grids() / name, options);
    Eigen::ArrayXXf block(60, 41);
    source->read(Quantity::temperature, 37, 20, block);
    CHECK(differing(block, truth().block(37, 20, 60, 41)) == 0);
    CHECK(source->axes().interval_s == 600.0);
}

TEST_CASE("a grid is gathered into the canonical record", "[store]") {
    const fs::path target = fresh_folder("gathered") / "r.nc";
    const auto files = GENERATE(
        std::vector<std::string>{"packed.nc"}, std::vector<std::string>{"blosc.zarr"},
        std::vector<std::string>{"unsorted.nc"}, std::vector<std::string>{"late.nc", "early.nc"});
    CAPTURE(files.front());
    NoProgress progress;
    const auto report = store::gather(campaign_of(files), target, "made", progress);
    CHECK(report.layout == campaign::Layout::grid);
    CHECK(report.traces == n_time);
    CHECK(report.duplicates == (files.size() == 2 ? 10 : 0));
    CHECK(report.interval_s == 600.0);
    const auto source = store::open_canonical(target);
    CHECK(differing(read_all(*source), truth()) == 0);
    CHECK(source->axes().time_s(149) == 1933149600.0 + 149 * 600.0);
    const Said said = python("check_cf.py", target.string());
    CAPTURE(said.text);
    CHECK(said.status == 0);
    CHECK(store::inspect(campaign_of(files)).distance_m.size() == n_place);
}

TEST_CASE("the stamp's place in the interval moves times to its middle", "[store]") {
    auto campaign = campaign_of({"deflate.nc"});
    campaign.record.stamp = campaign::Stamp::end;
    campaign.record.clock_offset_s = 5.0;
    NoProgress progress;
    const fs::path target = fresh_folder("stamped") / "r.nc";
    store::gather(campaign, target, "", progress);
    CHECK(store::open_canonical(target)->axes().time_s(0) == 1933149600.0 - 300.0 + 5.0);
}

TEST_CASE("text goes the same way", "[store]") {
    auto campaign = campaign_of({"wide.csv"});
    std::ofstream{grids() / "wide.csv"} << "time,0.0,0.5,1.0\n2031-04-05T10:00:00Z,1.25,2.5,nan\n"
                                           "2031-04-05T10:10:00Z,1.5,2.25,3\n";
    NoProgress progress;
    const fs::path target = fresh_folder("from_text") / "r.nc";
    CHECK(store::gather(campaign, target, "", progress).traces == 2);
    const Eigen::ArrayXXf values = read_all(*store::open_canonical(target));
    CHECK(values(0, 0) == 1.25F);
    CHECK(std::isnan(values(0, 2)));
    CHECK(values(1, 2) == 3.0F);
}

TEST_CASE("a grid that cannot be meant is refused by name", "[store]") {
    const auto [file, words] = GENERATE(table<std::string, std::string>({
        {"other_names.nc", "has no variable \"temperature\"; with two dimensions there are tmpw"},
        {"no_array.zarr", "has no variable \"temperature\""},
        {"empty.zarr", "is a folder without .zgroup or .zarray"},
        {"no_leap.nc", "the calendar of time is \"noleap\""},
        {"months.nc", "a length of time of fixed seconds is needed"},
        {"odd_unit.nc", "the unit of \"temperature\" is \"furlong\""},
        {"celsius_named_k.nc", "temperatures lie outside -80 to 120 degC"},
        {"twice.nc", "\"distance\" does not increase at index 8 (13.5 m, then 13.5 m)"},
        {"missing_time.nc", "the coordinate \"time\" is missing at index 4"},
        {"bomb.nc", "more than 2000 times as many"},
        {"cut_deflate_3.nc", "cut_deflate_3.nc: "},
        {"cut_deflate_50.nc", "is cut short or broken"},
        {"cut_deflate_90.nc", "is cut short or broken"},
        {"cut_classic_3.nc", "cut_classic_3.nc: "},
        {"cut_classic_50.nc", "is cut short"},
        {"cut_classic_90.nc", "is cut short"},
    }));
    CAPTURE(file);
    CHECK_THAT(refusal({file}), Contains(words));
}

TEST_CASE("files of one record that contradict each other are refused", "[store]") {
    CHECK_THAT(refusal({"early.nc", "contradicts.nc"}), Contains("with other values"));
    CHECK_THAT(refusal({"early.nc", "shifted.nc"}), Contains("say record.align"));
    CHECK_THAT(refusal({"early.nc", "values.f32"}), Contains("other files of the record are text"));
    campaign::Record options;
    options.temperature_unit = campaign::TemperatureUnit::kelvin;
    options.temperature_unit_said = true;
    CHECK_THAT(refusal({"deflate.nc"}, options),
               Contains("is \"degC\", but record.temperature_unit says \"K\""));
    options = {};
    options.distance_unit = campaign::DistanceUnit::foot;
    options.distance_unit_said = true;
    CHECK_THAT(refusal({"deflate.nc"}, options), Contains("record.distance_unit says \"ft\""));
    options = {};
    options.time_zone = "Europe/Zurich";
    CHECK_THAT(refusal({"days.nc"}, options), Contains("carry no offset"));
    options = {};
    options.layout = campaign::Layout::wide;
    CHECK_THAT(refusal({"deflate.nc"}, options), Contains("say record.layout = \"grid\""));
    options = {};
    options.align = campaign::Align::nearest;
    auto campaign = campaign_of({"early.nc", "shifted.nc"});
    campaign.record.align = campaign::Align::nearest;
    NoProgress progress;
    const fs::path target = fresh_folder("aligned") / "r.nc";
    store::gather(campaign, target, "", progress);
    CHECK(differing(read_all(*store::open_canonical(target)), truth()) == 0);
}

TEST_CASE("no path leads out of the local files", "[store]") {
    const campaign::Record options;
    for (const char* path : {"/vsicurl/http://localhost/x.nc", "/vsizip/a.zip/x.nc", "NETCDF:x.nc",
                             "http://localhost/x.nc", "/none/x.nc"})
        CHECK_THROWS_WITH(store::Grid(path, options), Contains("there is no such local file"));
}

TEST_CASE("bytes turned over in a grid are refused or give other numbers", "[store][property]") {
    std::mt19937_64 random{17};
    for (const std::string name : {"packed.nc", "classic.nc", "deflate_turned.nc"})
        for (int k = 0; k < 25; ++k) {
            const fs::path bad = fs::path{RILLSTRAND_SCRATCH} / "bad_grid.nc";
            fs::copy_file(grids() / name, bad, fs::copy_options::overwrite_existing);
            std::FILE* file = std::fopen(bad.c_str(), "r+b");
            std::fseek(file, static_cast<long>(random() % fs::file_size(bad)), SEEK_SET);
            const std::uint64_t noise = random();
            std::fwrite(&noise, 1, 8, file);
            std::fclose(file);
            try {
                const store::Grid grid{bad, campaign::Record{}};
                read_grid(grid);
            } catch (const DataError& error) {
                CHECK_THAT(error.what(), Contains("bad_grid.nc: "));
            }
        }
}

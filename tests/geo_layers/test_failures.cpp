// SPDX-License-Identifier: Apache-2.0
#include "geo_layers/reread.hpp"
#include "geo_layers/sample_layers.hpp"

#include "base/error.hpp"
#include "corridor.hpp"
#include "layers.hpp"

#include <catch2/catch.hpp>
#include <sys/resource.h>

#include <csignal>

using namespace rillstrand;
using namespace rillstrand::geo;
using campaign::LayerFormat;
using Catch::Matchers::Contains;

namespace {
/// Files of this process cannot grow beyond a size while this lives: a disk that is full.
class FullDisk {
public:
    explicit FullDisk(rlim_t bytes) : m_handler{std::signal(SIGXFSZ, SIG_IGN)} {
        getrlimit(RLIMIT_FSIZE, &m_before);
        const rlimit small{bytes, m_before.rlim_max};
        setrlimit(RLIMIT_FSIZE, &small);
    }
    ~FullDisk() {
        setrlimit(RLIMIT_FSIZE, &m_before);
        (void)std::signal(SIGXFSZ, m_handler);
    }
    FullDisk(const FullDisk&) = delete;
    FullDisk& operator=(const FullDisk&) = delete;
    FullDisk(FullDisk&&) = delete;
    FullDisk& operator=(FullDisk&&) = delete;

private:
    rlimit m_before{};
    void (*m_handler)(int);
};

/// Enough rows that every format needs more than a few pages.
LayerSet long_set() {
    LayerSet set;
    set.crs = "EPSG:25832";
    set.now = "2031-07-01T12:00:00Z";
    std::vector<double> x, y, z, fraction;
    for (int i = 0; i < 3000; ++i) {
        x.push_back(500000.0 + i);
        y.push_back(5200000.0 + 0.37 * i);
        z.push_back(600.0);
        fraction.push_back(0.123456789 / (i + 1));
    }
    Table table{"inflows", "Inflows"};
    table.add_real("fibre_m", "fibre distance", "m", x);
    table.add_real("fraction", "share", "1", fraction);
    set.layers = {point_layer(std::move(table), GeometryKind::point_z, x, y, z)};
    return set;
}
} // namespace

TEST_CASE("a full disk is told with the file's name", "[layers][property]") {
    const auto format =
        GENERATE(LayerFormat::gpkg, LayerFormat::geojson, LayerFormat::flatgeobuf, LayerFormat::kml,
                 LayerFormat::gpx, LayerFormat::shapefile, LayerFormat::csv);
    const auto kibibytes = GENERATE(0, 1, 4, 15, 40);
    const auto folder = sample::fresh_folder("full_disk");
    const LayerSet set = long_set();
    INFO("format " << static_cast<int>(format) << ", " << kibibytes << " KiB");
    std::string message;
    {
        const FullDisk full{static_cast<rlim_t>(kibibytes) * 1024};
        try {
            write_layers(set, {format}, folder);
        } catch (const MachineError& error) {
            message = error.what();
        }
    }
    CHECK_THAT(message, Contains(folder.string()) && Contains("cannot be written"));
}

TEST_CASE("a full disk under a raster is told with the file's name", "[corridor][property]") {
    const auto kibibytes = GENERATE(0, 1, 4, 15);
    const auto folder = sample::fresh_folder("full_disk_raster");
    Corridor corridor;
    corridor.crs = "EPSG:25832";
    for (int i = 0; i < 3000; ++i) {
        corridor.x.push_back(500000.0 + i);
        corridor.y.push_back(5200000.0 + 0.37 * i);
        corridor.value.push_back(std::sin(i * 0.7));
    }
    std::string message;
    {
        const FullDisk full{static_cast<rlim_t>(kibibytes) * 1024};
        try {
            write_corridor(corridor, folder / "mean.tif");
        } catch (const MachineError& error) {
            message = error.what();
        }
    }
    CHECK_THAT(message, Contains("mean.tif") && Contains("cannot be written"));
}

TEST_CASE("a folder that is not there or is a file is told", "[layers][property]") {
    const auto folder = sample::fresh_folder("no_folder");
    std::fclose(std::fopen((folder / "file").c_str(), "w"));
    CHECK_THROWS_AS(write_layers(long_set(), {LayerFormat::gpkg}, folder / "file"), MachineError);
}

TEST_CASE("sets that cannot be written are refused", "[layers][property]") {
    const auto folder = sample::fresh_folder("refused");
    LayerSet set = long_set();
    SECTION("unknown coordinate system") {
        set.crs = "EPSG:999999";
        CHECK_THROWS_WITH(write_layers(set, {LayerFormat::gpkg}, folder), Contains("EPSG:999999"));
        CHECK_THROWS_AS(write_layers(set, {LayerFormat::geojson}, folder), DataError);
    }
    SECTION("a coordinate system that is a file or an address") {
        for (const char* crs :
             {"/etc/hostname", "http://localhost/crs.wkt", "file:///etc/hostname"}) {
            set.crs = crs;
            CHECK_THROWS_AS(write_layers(set, {LayerFormat::geojson}, folder), DataError);
        }
    }
    SECTION("two layers of one name") {
        set.layers.push_back(table_layer(Table{"column_Mast A"}));
        set.layers.push_back(table_layer(Table{"column_mast-a"}));
        CHECK_THROWS_WITH(write_layers(set, {LayerFormat::gpkg}, folder),
                          Contains("column_mast_a"));
    }
    SECTION("positions without a coordinate system") {
        set.crs.clear();
        CHECK_THROWS_WITH(write_layers(set, {LayerFormat::gpkg}, folder), Contains("crs"));
    }
    SECTION("two columns of one name") {
        Table table{"channels"};
        table.add_real("canopy", "", "", {});
        table.add_real("Canopy", "", "", {});
        set.layers.push_back(table_layer(std::move(table)));
        CHECK_THROWS_WITH(write_layers(set, {LayerFormat::gpkg}, folder), Contains("Canopy"));
    }
    SECTION("fewer geometries than rows") {
        set.layers[0].vertices.pop_back();
        CHECK_THROWS_WITH(write_layers(set, {LayerFormat::gpkg}, folder), Contains("2999"));
    }
    CHECK_FALSE(std::filesystem::exists(folder / "layers.gpkg"));
}

TEST_CASE("columns and layers may have names that formats keep for themselves",
          "[layers][property]") {
    const auto folder = sample::fresh_folder("kept_names");
    LayerSet set = long_set();
    Table table{"gpkg_contents"};
    for (const char* name : {"fid", "geom", "ogc_fid", "shape", "select", "row_fid"})
        table.add_real(name, "", "", {1.5});
    set.layers = {point_layer(std::move(table), GeometryKind::point, {500000.0}, {5200000.0}),
                  table_layer(Table{"layer_styles"}), table_layer(Table{"../../../etc/x"})};
    const auto written = write_layers(set, {LayerFormat::gpkg, LayerFormat::csv}, folder);
    for (const auto& file : written.files)
        CHECK(file.lexically_normal().string().find("..") == std::string::npos);
    const auto file = reread::open(folder / "layers.gpkg");
    REQUIRE(file != nullptr);
    reread::check_layer(*file, "layer_gpkg_contents", set.layers[0], {});
}

TEST_CASE("a set without places needs no coordinate system", "[layers][property]") {
    const auto folder = sample::fresh_folder("no_crs");
    LayerSet set = long_set();
    set.crs.clear();
    set.layers = {table_layer(set.layers[0].table)};
    const auto written =
        write_layers(set,
                     {LayerFormat::gpkg, LayerFormat::geojson, LayerFormat::flatgeobuf,
                      LayerFormat::kml, LayerFormat::gpx, LayerFormat::shapefile, LayerFormat::csv},
                     folder);
    const auto file = reread::open(folder / "layers.gpkg");
    reread::check_layer(*file, "inflows", set.layers[0], {});
}

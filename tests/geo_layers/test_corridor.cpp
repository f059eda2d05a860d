// SPDX-License-Identifier: Apache-2.0
#include "geo_layers/sample_layers.hpp"

#include "base/error.hpp"
#include "corridor.hpp"

#include <catch2/catch.hpp>
#include <gdal_priv.h>

#include <Eigen/Core>

#include <cmath>
#include <fstream>
#include <limits>
#include <memory>
#include <random>
#include <sstream>

using namespace rillstrand;
using geo::Corridor;

namespace {
constexpr double missing = std::numeric_limits<double>::quiet_NaN();

struct Close {
    void operator()(GDALDataset* dataset) const { GDALClose(dataset); }
};
using File = std::unique_ptr<GDALDataset, Close>;

File open_raster(const std::filesystem::path& path) {
    GDALAllRegister();
    return File{GDALDataset::Open(path.c_str(), GDAL_OF_RASTER)};
}

std::vector<float> read(GDALDataset& raster) {
    const int w = raster.GetRasterXSize(), h = raster.GetRasterYSize();
    std::vector<float> values(static_cast<std::size_t>(w) * static_cast<std::size_t>(h));
    REQUIRE(raster.GetRasterBand(1)->RasterIO(GF_Read, 0, 0, w, h, values.data(), w, h, GDT_Float32,
                                              0, 0, nullptr) == CE_None);
    return values;
}

/// A winding cable of 120 channels, one metre apart, in UTM zone 32; one value missing, one place.
Corridor winding_cable() {
    Corridor corridor;
    corridor.title = "Mean temperature";
    corridor.unit = "degC";
    corridor.crs = "EPSG:25832";
    corridor.corridor_m = 3.0;
    corridor.max_gap_m = 5.0;
    std::mt19937 random{7};
    std::normal_distribution<double> turn{0.0, 0.2};
    double heading = 0.3, x = 512345.0, y = 5278120.0;
    for (int i = 0; i < 120; ++i) {
        corridor.x.push_back(x);
        corridor.y.push_back(y);
        corridor.value.push_back(i);
        heading += turn(random);
        // A leap that is wider than max_gap_m: the two parts are not joined.
        const double step = i == 60 ? 20.0 : 1.0;
        x += step * std::cos(heading);
        y += step * std::sin(heading);
    }
    corridor.value[30] = missing;
    corridor.x[90] = corridor.y[90] = missing;
    return corridor;
}

double to_segment(const Eigen::Vector2d& p, const Eigen::Vector2d& a, const Eigen::Vector2d& b) {
    const double length2 = (b - a).squaredNorm();
    const double t = length2 > 0.0 ? std::clamp((p - a).dot(b - a) / length2, 0.0, 1.0) : 0.0;
    return (p - a - t * (b - a)).norm();
}
} // namespace

TEST_CASE("every cell of a corridor has its nearest channel's value", "[corridor][property]") {
    const auto folder = geo::sample::fresh_folder("corridor");
    const Corridor corridor = winding_cable();
    const auto result = geo::write_corridor(corridor, folder / "mean.tif");
    CHECK(result.warnings.empty());
    CHECK(result.resolution_m == Approx(0.5)); // half of the spacing of one metre
    const auto raster = open_raster(folder / "mean.tif");
    REQUIRE(raster != nullptr);
    CHECK(raster->GetRasterXSize() == result.width);
    CHECK(raster->GetRasterYSize() == result.height);
    CHECK(std::isnan(raster->GetRasterBand(1)->GetNoDataValue()));
    CHECK(std::string{raster->GetRasterBand(1)->GetUnitType()} == "degC");
    double g[6] = {};
    raster->GetGeoTransform(g);
    const auto values = read(*raster);
    int wrong = 0, painted = 0;
    const auto n = corridor.x.size();
    for (int row = 0; row < result.height; ++row)
        for (int column = 0; column < result.width; ++column) {
            const Eigen::Vector2d p{g[0] + (column + 0.5) * g[1], g[3] + (row + 0.5) * g[5]};
            // Every pair of neighbours, in full: no boxes, no strips.
            double best = 1e300, expected = missing;
            for (std::size_t i = 0; i + 1 < n; ++i) {
                const Eigen::Vector2d a{corridor.x[i], corridor.y[i]};
                const Eigen::Vector2d b{corridor.x[i + 1], corridor.y[i + 1]};
                if (!((b - a).norm() <= corridor.max_gap_m))
                    continue;
                if (to_segment(p, a, b) > corridor.corridor_m)
                    continue;
                for (const auto& [end, value] :
                     {std::pair{a, corridor.value[i]}, std::pair{b, corridor.value[i + 1]}})
                    if ((p - end).norm() < best) {
                        best = (p - end).norm();
                        expected = value;
                    }
            }
            const float got =
                values[static_cast<std::size_t>(row) * static_cast<std::size_t>(result.width) +
                       static_cast<std::size_t>(column)];
            const bool same =
                std::isnan(expected) ? std::isnan(got) : got == static_cast<float>(expected);
            wrong += same ? 0 : 1;
            painted += std::isnan(got) ? 0 : 1;
        }
    CHECK(wrong == 0);
    // About 117 m of cable, six metres wide, in cells of a quarter square metre.
    CHECK(painted > 117 * 6 * 4 * 3 / 4);
}

// GDAL's own checker of Cloud Optimized GeoTIFF (python3-gdal).
TEST_CASE("the raster is a Cloud Optimized GeoTIFF", "[corridor][published]") {
    const auto folder = geo::sample::fresh_folder("corridor_cog");
    Corridor corridor = winding_cable();
    corridor.corridor_m = 40.0;
    corridor.max_gap_m = 50.0;
    for (std::size_t i = 0; i < corridor.x.size(); ++i)
        corridor.x[i] += 8.0 * static_cast<double>(i);
    geo::write_corridor(corridor, folder / "mean.tif");
    const std::string command =
        "/usr/bin/python3 -m osgeo_utils.samples.validate_cloud_optimized_geotiff -q " +
        (folder / "mean.tif").string() + " > /dev/null";
    CHECK(std::system(command.c_str()) == 0); // NOLINT: a test's own command
    CHECK(open_raster(folder / "mean.tif")->GetRasterBand(1)->GetOverviewCount() > 0);
    for (const auto& entry : std::filesystem::directory_iterator{folder})
        CHECK(entry.path().filename() == "mean.tif");
}

TEST_CASE("a corridor in degrees is made in the cable's UTM zone", "[corridor][property]") {
    const auto folder = geo::sample::fresh_folder("corridor_degrees");
    Corridor corridor = winding_cable();
    corridor.crs = "EPSG:4326";
    for (std::size_t i = 0; i < corridor.x.size(); ++i) {
        corridor.x[i] = 9.1 + (corridor.x[i] - 512345.0) / 75000.0;
        corridor.y[i] = -47.6 + (corridor.y[i] - 5278120.0) / 111000.0;
    }
    const auto result = geo::write_corridor(corridor, folder / "mean.tif");
    CHECK(result.resolution_m == Approx(0.5).epsilon(0.05));
    const auto raster = open_raster(folder / "mean.tif");
    REQUIRE(raster->GetSpatialRef() != nullptr);
    CHECK(std::string{raster->GetSpatialRef()->GetAuthorityCode(nullptr)} == "32732");
}

TEST_CASE("a corridor in feet keeps its width", "[corridor][property]") {
    const auto folder = geo::sample::fresh_folder("corridor_feet");
    Corridor corridor;
    corridor.crs = "EPSG:2278"; // Texas South Central, US survey feet
    corridor.corridor_m = 6.0;
    corridor.x = {2963503.0, 2963503.0 + 30.0};
    corridor.y = {254759.0, 254759.0};
    corridor.value = {1.0, 2.0};
    const auto result = geo::write_corridor(corridor, folder / "mean.tif");
    const double foot = 1200.0 / 3937.0;
    const double length_m = 30.0 * foot;
    CHECK(result.resolution_m == Approx(3.0)); // corridor_m / 2, under half the spacing
    CHECK(result.width * result.resolution_m == Approx(length_m + 12.0).margin(2 * 3.0));
    CHECK(result.height * result.resolution_m == Approx(12.0).margin(2 * 3.0));
}

TEST_CASE("a raster of too many cells is coarsened and says so", "[corridor][property]") {
    const auto folder = geo::sample::fresh_folder("corridor_large");
    Corridor corridor;
    corridor.crs = "EPSG:25832";
    corridor.corridor_m = 5.0;
    corridor.max_gap_m = 5.0;
    for (int i = 0; i < 6000; ++i) {
        corridor.x.push_back(500000.0 + 0.9 * i);
        corridor.y.push_back(5200000.0 + 0.9 * i);
        corridor.value.push_back(i);
    }
    const auto result = geo::write_corridor(corridor, folder / "mean.tif");
    CHECK(static_cast<double>(result.width) * result.height <= 50e6);
    REQUIRE(result.warnings.size() == 1);
    CHECK(result.warnings[0].code == "corridor-coarsened");
}

TEST_CASE("a corridor without any position is refused", "[corridor][property]") {
    Corridor corridor;
    corridor.crs = "EPSG:25832";
    corridor.x = corridor.y = corridor.value = {missing, missing};
    CHECK_THROWS_AS(geo::write_corridor(corridor, "unused.tif"), DataError);
    CHECK_FALSE(std::filesystem::exists("unused.tif"));
}

// SPDX-License-Identifier: Apache-2.0
#include "geo_layers/sample_layers.hpp"

#include "background.hpp"
#include "base/error.hpp"

#include <catch2/catch.hpp>
#include <cpl_vsi.h>
#include <gdal_priv.h>
#include <ogr_spatialref.h>

#include <array>
#include <cmath>
#include <fstream>
#include <memory>

using namespace rillstrand;

namespace {
struct Close {
    void operator()(GDALDataset* dataset) const { GDALClose(dataset); }
};
using File = std::unique_ptr<GDALDataset, Close>;

/// A GeoTIFF in UTM zone 32 of 200 x 100 cells of 5 m: red in its western half, blue in the other.
std::filesystem::path two_colours(const std::string& name, GDALDataType type, int bands,
                                  double high) {
    GDALAllRegister();
    const auto path = geo::sample::fresh_folder(name) / "ortho.tif";
    const File file{GetGDALDriverManager()->GetDriverByName("GTiff")->Create(path.c_str(), 200, 100,
                                                                             bands, type, nullptr)};
    std::array<double, 6> transform{512000.0, 5.0, 0.0, 5278500.0, 0.0, -5.0};
    file->SetGeoTransform(transform.data());
    OGRSpatialReference crs;
    crs.importFromEPSG(25832);
    file->SetSpatialRef(&crs);
    for (int b = 1; b <= bands; ++b) {
        std::vector<double> row(200, 0.0);
        for (std::size_t i = 0; i < row.size(); ++i)
            row[i] = (i < 100 && b == 1) || (i >= 100 && b == 3) ? high : 0.0;
        for (int y = 0; y < 100; ++y)
            REQUIRE(file->GetRasterBand(b)->RasterIO(GF_Write, 0, y, 200, 1, row.data(), 200, 1,
                                                     GDT_Float64, 0, 0, nullptr) == CE_None);
    }
    return path;
}

/// Longitude and latitude of a place in UTM zone 32.
std::array<double, 2> degrees(double x, double y) {
    OGRSpatialReference from, to;
    from.importFromEPSG(25832);
    to.importFromEPSG(4326);
    from.SetAxisMappingStrategy(OAMS_TRADITIONAL_GIS_ORDER);
    to.SetAxisMappingStrategy(OAMS_TRADITIONAL_GIS_ORDER);
    const std::unique_ptr<OGRCoordinateTransformation> change{
        OGRCreateCoordinateTransformation(&from, &to)};
    REQUIRE(change->Transform(1, &x, &y));
    return {x, y};
}

/// The colour at a place, as a map that shows the picture between its edges would draw it.
std::array<int, 4> colour_at(const geo::Background& background, double lon, double lat) {
    const std::string name = "/vsimem/background_test.webp";
    std::vector<std::byte> bytes = background.webp;
    VSIFCloseL(VSIFileFromMemBuffer(name.c_str(), reinterpret_cast<GByte*>(bytes.data()),
                                    bytes.size(), FALSE));
    const File file{GDALDataset::Open(name.c_str(), GDAL_OF_RASTER)};
    REQUIRE(file != nullptr);
    REQUIRE(file->GetRasterXSize() == background.width);
    REQUIRE(file->GetRasterYSize() == background.height);
    // Spherical Mercator, EPSG method 1024: y = R ln tan(pi/4 + lat/2).
    const auto mercator = [](double degree) {
        return std::log(std::tan(M_PI / 4.0 + degree * M_PI / 360.0));
    };
    const int column = static_cast<int>(background.width * (lon - background.west) /
                                        (background.east - background.west));
    const int row =
        static_cast<int>(background.height * (mercator(background.north) - mercator(lat)) /
                         (mercator(background.north) - mercator(background.south)));
    std::array<int, 4> colour{0, 0, 0, 255};
    for (int b = 0; b < file->GetRasterCount(); ++b)
        REQUIRE(file->GetRasterBand(b + 1)->RasterIO(GF_Read, column, row, 1, 1,
                                                     &colour.at(static_cast<std::size_t>(b)), 1, 1,
                                                     GDT_Int32, 0, 0, nullptr) == CE_None);
    return colour;
}

std::array<double, 4> middle_part() {
    const auto low = degrees(512300.0, 5278150.0), high = degrees(512700.0, 5278350.0);
    return {low[0], low[1], high[0], high[1]};
}
} // namespace

TEST_CASE("a background lies where it belongs", "[background][property]") {
    const auto [type, high] = GENERATE(
        table<GDALDataType, double>({{GDT_Byte, 255.0}, {GDT_UInt16, 4000.0}, {GDT_Float32, 0.7}}));
    const auto path = two_colours("background", type, 3, high);
    const auto background = geo::warp_background(path, middle_part(), 400);
    CHECK(std::max(background.width, background.height) == 400);
    const auto west = degrees(512480.0, 5278250.0), east = degrees(512520.0, 5278250.0);
    const auto red = colour_at(background, west[0], west[1]);
    const auto blue = colour_at(background, east[0], east[1]);
    CHECK(red[0] > 200);
    CHECK(red[2] < 50);
    CHECK(red[3] == 255);
    CHECK(blue[0] < 50);
    CHECK(blue[2] > 200);
    // The part around the cable alone, with a margin.
    const auto around = middle_part();
    CHECK(background.west < around[0]);
    CHECK(background.east > around[2]);
    CHECK(background.south < around[1]);
    CHECK(background.north > around[3]);
    CHECK(background.east - background.west < 2.0 * (around[2] - around[0]));
}

TEST_CASE("what no background can be made of is refused", "[background][property]") {
    const auto path = two_colours("background_bad", GDT_Byte, 1, 255.0);
    SECTION("it lies elsewhere") {
        CHECK_THROWS_WITH(geo::warp_background(path, {20.0, 10.0, 20.1, 10.1}),
                          Catch::Matchers::Contains("lies away from the cable"));
    }
    SECTION("it is missing, a folder, text or a virtual file") {
        CHECK_THROWS_AS(geo::warp_background(path.parent_path() / "none.tif", middle_part()),
                        DataError);
        CHECK_THROWS_AS(geo::warp_background(path.parent_path(), middle_part()), DataError);
        CHECK_THROWS_AS(geo::warp_background("/vsimem/ortho.tif", middle_part()), DataError);
        const auto vrt = path.parent_path() / "ortho.vrt";
        std::ofstream{vrt} << "<VRTDataset rasterXSize=\"1\" rasterYSize=\"1\">"
                              "<VRTRasterBand dataType=\"Byte\" band=\"1\"/></VRTDataset>";
        CHECK_THROWS_AS(geo::warp_background(vrt, middle_part()), DataError);
    }
    SECTION("it has no coordinate system") {
        const auto plain = path.parent_path() / "plain.tif";
        File{GetGDALDriverManager()->GetDriverByName("GTiff")->Create(plain.c_str(), 10, 10, 1,
                                                                      GDT_Byte, nullptr)};
        CHECK_THROWS_WITH(geo::warp_background(plain, middle_part()),
                          Catch::Matchers::Contains("has no coordinate system"));
    }
}

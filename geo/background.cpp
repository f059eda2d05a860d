// SPDX-License-Identifier: Apache-2.0
#include "background.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "layers_gdal.hpp"

#include <gdal_alg.h>
#include <gdal_utils.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <memory>
#include <numbers>
#include <string>

namespace rillstrand::geo {

namespace {
constexpr double mercator_radius_m = 6378137.0; // EPSG method 1024
constexpr double most_latitude = 85.06;
constexpr double margin = 0.15; // of the view, around it

struct Box {
    double west = 0.0, south = 0.0, east = 0.0, north = 0.0;
};

double mercator_x(double lon) {
    return mercator_radius_m * lon * std::numbers::pi / 180.0;
}
double mercator_y(double lat) {
    const double limited = std::clamp(lat, -most_latitude, most_latitude);
    return mercator_radius_m * std::asinh(std::tan(limited * std::numbers::pi / 180.0));
}
double longitude(double x) {
    return x / mercator_radius_m * 180.0 / std::numbers::pi;
}
double latitude(double y) {
    return std::atan(std::sinh(y / mercator_radius_m)) * 180.0 / std::numbers::pi;
}

[[noreturn]] void unusable(const std::filesystem::path& file, const std::string& what) {
    throw DataError{file.string() + ": background picture " + what +
                    "; give a GeoTIFF, or a PNG, JPEG or JPEG 2000 with a coordinate system"};
}

Dataset open_picture(const std::filesystem::path& file, const GdalFailures& failures) {
    // A plain local file alone: names that GDAL would take for an address or a virtual file end
    // here.
    std::error_code error;
    if (!std::filesystem::is_regular_file(file, error))
        unusable(file, "is not a file");
    for (const char* name : {"GTiff", "PNG", "JPEG", "JP2OpenJPEG"})
        (void)driver(name);
    constexpr std::array<const char*, 5> drivers{"GTiff", "PNG", "JPEG", "JP2OpenJPEG", nullptr};
    const auto absolute = std::filesystem::absolute(file);
    Dataset picture{GDALDataset::Open(absolute.c_str(), GDAL_OF_RASTER | GDAL_OF_READONLY,
                                      drivers.data(), nullptr, nullptr)};
    if (!picture)
        unusable(file, "cannot be read (" + failures.text() + ")");
    if (picture->GetSpatialRef() == nullptr)
        unusable(file, "has no coordinate system");
    return picture;
}

/// Where the picture lies, in metres of spherical Mercator.
Box extent_of(GDALDataset& picture, const std::filesystem::path& file,
              const GdalFailures& failures) {
    GdalOptions options{"DST_SRS=EPSG:3857"};
    const std::unique_ptr<void, void (*)(void*)> change{
        GDALCreateGenImgProjTransformer2(&picture, nullptr, options.get()),
        GDALDestroyGenImgProjTransformer};
    std::array<double, 6> transform{};
    int width = 0, height = 0;
    if (!change || GDALSuggestedWarpOutput(&picture, GDALGenImgProjTransform, change.get(),
                                           transform.data(), &width, &height) != CE_None)
        unusable(file, "cannot be brought to the map (" + failures.text() + ")");
    return {transform[0], transform[3] + transform[5] * height, transform[0] + transform[1] * width,
            transform[3]};
}

Box view_of(const std::array<double, 4>& around) {
    Box view{mercator_x(around[0]), mercator_y(around[1]), mercator_x(around[2]),
             mercator_y(around[3])};
    const double pad = std::max(margin * std::max(view.east - view.west, view.north - view.south),
                                20.0 / std::cos(around[1] * std::numbers::pi / 180.0));
    return {view.west - pad, view.south - pad, view.east + pad, view.north + pad};
}

Box common(const Box& a, const Box& b) {
    return {std::max(a.west, b.west), std::max(a.south, b.south), std::min(a.east, b.east),
            std::min(a.north, b.north)};
}

Dataset warp(GDALDataset& picture, const Box& box, int width, int height) {
    const bool indexed = picture.GetRasterBand(1)->GetColorTable() != nullptr;
    GdalOptions words{"-of", "MEM", "-t_srs", "EPSG:3857", "-dstalpha", "-r"};
    words.add(indexed ? "near" : "bilinear");
    words.add("-te");
    for (const double edge : {box.west, box.south, box.east, box.north})
        words.add(text::number(edge));
    words.add("-ts");
    words.add(std::to_string(width));
    words.add(std::to_string(height));
    const std::unique_ptr<GDALWarpAppOptions, void (*)(GDALWarpAppOptions*)> options{
        GDALWarpAppOptionsNew(words.get(), nullptr), GDALWarpAppOptionsFree};
    GDALDatasetH source = &picture;
    return Dataset{
        GDALDataset::FromHandle(GDALWarp("", nullptr, 1, &source, options.get(), nullptr))};
}

/// One band of the warped picture, row by row.
std::vector<double> values_of(GDALRasterBand& band) {
    const int width = band.GetXSize(), height = band.GetYSize();
    std::vector<double> values(static_cast<std::size_t>(width) * static_cast<std::size_t>(height));
    if (band.RasterIO(GF_Read, 0, 0, width, height, values.data(), width, height, GDT_Float64, 0, 0,
                      nullptr) != CE_None)
        return {};
    return values;
}

/// Brings values to 0 ... 255: bytes as they are, others from their range where there is a picture.
void stretch(std::vector<double>& values, const std::vector<double>& opacity, bool bytes) {
    if (bytes)
        return;
    double low = std::numeric_limits<double>::infinity(), high = -low;
    for (std::size_t i = 0; i < values.size(); ++i) {
        if (opacity[i] <= 0.0 || !std::isfinite(values[i]))
            continue;
        low = std::min(low, values[i]);
        high = std::max(high, values[i]);
    }
    const double scale = high > low ? 255.0 / (high - low) : 0.0;
    for (double& v : values)
        v = std::isfinite(v) ? (v - low) * scale : 0.0;
}

/// Red, green, blue and opacity, a plane each.
using Planes = std::array<std::vector<double>, 4>;

void colours_from_table(const GDALColorTable& table, Planes& planes) {
    const std::vector<double> index = planes[0];
    for (std::size_t i = 0; i < index.size(); ++i) {
        const GDALColorEntry* entry = table.GetColorEntry(static_cast<int>(index[i]));
        if (entry == nullptr)
            continue;
        planes[0][i] = entry->c1;
        planes[1][i] = entry->c2;
        planes[2][i] = entry->c3;
        if (entry->c4 == 0)
            planes[3][i] = 0.0;
    }
}

Planes planes_of(GDALDataset& warped, const GDALColorTable* table) {
    std::vector<GDALRasterBand*> colours;
    GDALRasterBand* alpha = nullptr;
    for (auto* band : warped.GetBands())
        if (band->GetColorInterpretation() == GCI_AlphaBand)
            alpha = band;
        else
            colours.push_back(band);
    const bool bytes = warped.GetRasterBand(1)->GetRasterDataType() == GDT_Byte;
    Planes planes;
    planes[3] = alpha != nullptr ? values_of(*alpha) : std::vector<double>{};
    for (double& v : planes[3])
        v = v > 0.0 ? 255.0 : 0.0;
    for (std::size_t i = 0; i < 3 && !colours.empty() && !planes[3].empty(); ++i) {
        planes[i] = values_of(*colours[colours.size() >= 3 ? i : 0]);
        if (!planes[i].empty())
            stretch(planes[i], planes[3], bytes);
    }
    if (table != nullptr)
        colours_from_table(*table, planes);
    return planes;
}

std::vector<std::byte> to_webp(const Planes& planes, int width, int height,
                               const std::filesystem::path& file, const GdalFailures& failures) {
    const Dataset rgba{driver("MEM")->Create("", width, height, 4, GDT_Byte, nullptr)};
    for (std::size_t i = 0; i < planes.size(); ++i) {
        std::vector<double> plane = planes[i];
        if (plane.empty() || rgba->GetRasterBand(static_cast<int>(i) + 1)
                                     ->RasterIO(GF_Write, 0, 0, width, height, plane.data(), width,
                                                height, GDT_Float64, 0, 0, nullptr) != CE_None)
            unusable(file, "cannot be read in full (" + failures.text() + ")");
    }
    const MemoryFile memory{"background.webp"};
    GdalOptions options{"QUALITY=85"};
    Dataset written{driver("WEBP")->CreateCopy(memory.name().c_str(), rgba.get(), FALSE,
                                               options.get(), nullptr, nullptr)};
    if (!written)
        unusable(file, "cannot be packed for the page (" + failures.text() + ")");
    written.reset();
    const std::string bytes = memory.content();
    std::vector<std::byte> result(bytes.size());
    std::transform(bytes.begin(), bytes.end(), result.begin(),
                   [](char c) { return static_cast<std::byte>(c); });
    return result;
}
} // namespace

Background warp_background(const std::filesystem::path& file, const std::array<double, 4>& around,
                           int max_pixels) {
    const GdalOption no_sidecar{"GDAL_PAM_ENABLED", "NO"};
    const GdalFailures failures;
    OSRSetPROJEnableNetwork(0);
    (void)driver("MEM");
    const Dataset picture = open_picture(file, failures);
    const Box box = common(extent_of(*picture, file, failures), view_of(around));
    if (!(box.west < box.east && box.south < box.north))
        throw DataError{file.string() +
                        ": background picture lies away from the cable; give one that covers it, "
                        "or leave background out of [page]"};
    const double aspect = (box.east - box.west) / (box.north - box.south);
    const double longer = max_pixels;
    const int width = std::max(1, static_cast<int>(std::lround(std::min(longer, longer * aspect))));
    const int height =
        std::max(1, static_cast<int>(std::lround(std::min(longer, longer / aspect))));
    const Dataset warped = warp(*picture, box, width, height);
    if (!warped)
        unusable(file, "cannot be brought to the map (" + failures.text() + ")");
    const Planes planes = planes_of(*warped, picture->GetRasterBand(1)->GetColorTable());
    Background background;
    background.webp = to_webp(planes, width, height, file, failures);
    background.width = width;
    background.height = height;
    background.west = longitude(box.west);
    background.east = longitude(box.east);
    background.south = latitude(box.south);
    background.north = latitude(box.north);
    return background;
}

} // namespace rillstrand::geo

// SPDX-License-Identifier: Apache-2.0
#include "raster_sample.hpp"

#include <cpl_error.h>
#include <gdal_priv.h>
#include <ogr_spatialref.h>
#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <array>
#include <cmath>
#include <limits>
#include <map>
#include <memory>
#include <numbers>

namespace rillstrand::geo {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

struct CloseDataset {
    void operator()(GDALDataset* dataset) const { GDALClose(dataset); }
};

/// Cells of one band, fetched by strips of rows and kept.
class Cells {
public:
    explicit Cells(GDALRasterBand& band)
        : m_band{band}, m_width{band.GetXSize()}, m_height{band.GetYSize()} {
        int has = 0;
        const double value = band.GetNoDataValue(&has);
        if (has != 0)
            m_nodata = value;
    }
    double at(int column, int row) {
        if (column < 0 || row < 0 || column >= m_width || row >= m_height)
            return nan;
        constexpr int strip_rows = 64;
        const int strip = row / strip_rows;
        auto found = m_strips.find(strip);
        if (found == m_strips.end()) {
            if (m_strips.size() > 64)
                m_strips.clear();
            const int first = strip * strip_rows;
            const int rows = std::min(strip_rows, m_height - first);
            std::vector<double> values(static_cast<std::size_t>(rows) *
                                       static_cast<std::size_t>(m_width));
            if (m_band.RasterIO(GF_Read, 0, first, m_width, rows, values.data(), m_width, rows,
                                GDT_Float64, 0, 0) != CE_None)
                throw DataError{std::string{"a raster cannot be read ("} + CPLGetLastErrorMsg() +
                                "); copy it again"};
            found = m_strips.emplace(strip, std::move(values)).first;
        }
        const double value = found->second[static_cast<std::size_t>(row % strip_rows) *
                                               static_cast<std::size_t>(m_width) +
                                           static_cast<std::size_t>(column)];
        return value == m_nodata ? nan : value;
    }

private:
    GDALRasterBand& m_band;
    int m_width, m_height;
    double m_nodata = nan;
    std::map<int, std::vector<double>> m_strips;
};

double bilinear(Cells& cells, double column, double row) {
    // Cell centres lie at half numbers.
    const double c = column - 0.5, r = row - 0.5;
    const int c0 = static_cast<int>(std::floor(c)), r0 = static_cast<int>(std::floor(r));
    const double wc = c - c0, wr = r - r0;
    const double mixed = (1.0 - wr) * ((1.0 - wc) * cells.at(c0, r0) + wc * cells.at(c0 + 1, r0)) +
                         wr * ((1.0 - wc) * cells.at(c0, r0 + 1) + wc * cells.at(c0 + 1, r0 + 1));
    if (std::isfinite(mixed))
        return mixed;
    return cells.at(static_cast<int>(std::floor(column)), static_cast<int>(std::floor(row)));
}

/// Slope and aspect, degrees, from the 3 x 3 cells around a point.
std::array<double, 2> slope_aspect(Cells& cells, double column, double row, double width_m,
                                   double height_m) {
    const int c = static_cast<int>(std::floor(column)), r = static_cast<int>(std::floor(row));
    const auto z = [&](int dc, int dr) { return cells.at(c + dc, r + dr); };
    const double east =
        ((z(1, -1) + 2 * z(1, 0) + z(1, 1)) - (z(-1, -1) + 2 * z(-1, 0) + z(-1, 1))) /
        (8.0 * width_m);
    const double north =
        ((z(-1, -1) + 2 * z(0, -1) + z(1, -1)) - (z(-1, 1) + 2 * z(0, 1) + z(1, 1))) /
        (8.0 * height_m);
    constexpr double degree = 180.0 / std::numbers::pi;
    const double slope = std::atan(std::hypot(east, north)) * degree;
    if (!std::isfinite(slope))
        return {nan, nan};
    double aspect = std::atan2(-east, -north) * degree;
    if (aspect < 0.0)
        aspect += 360.0;
    return {slope, slope > 0.0 ? aspect : nan};
}

using Dataset = std::unique_ptr<GDALDataset, CloseDataset>;

Dataset open_raster(const std::filesystem::path& file, const std::string& key) {
    CPLPushErrorHandler(CPLQuietErrorHandler);
    const std::array<const char*, 6> drivers{"GTiff", "AAIGrid", "HFA", "SRTMHGT", "PNG", nullptr};
    Dataset dataset{GDALDataset::Open(file.c_str(), GDAL_OF_RASTER | GDAL_OF_READONLY,
                                      drivers.data(), nullptr, nullptr)};
    CPLPopErrorHandler();
    if (!dataset)
        throw DataError{file.string() +
                        ": cannot be read as a raster (GeoTIFF, ASCII grid, IMG, HGT); correct " +
                        key};
    return dataset;
}

/// Where a raster lies: cell = inverse applied to x, y of its own system.
struct Frame {
    std::array<double, 6> transform{}, inverse{};
    Crs crs;
};

Frame frame_of(GDALDataset& dataset, const std::filesystem::path& file, const std::string& key) {
    std::array<double, 6> transform{}, inverse{};
    const OGRSpatialReference* reference = dataset.GetSpatialRef();
    if (reference == nullptr || dataset.GetGeoTransform(transform.data()) != CE_None ||
        GDALInvGeoTransform(transform.data(), inverse.data()) == 0)
        throw DataError{file.string() +
                        ": has no coordinate system or no place on the ground; georeference it"};
    char* wkt = nullptr;
    const std::array<const char*, 2> options{"FORMAT=WKT2_2019", nullptr};
    reference->exportToWkt(&wkt, options.data());
    const std::string crs_text = wkt == nullptr ? "" : wkt;
    CPLFree(wkt);
    return {transform, inverse, Crs{crs_text, key}};
}

/// Samples the points [first, last) into `out`.
void sample_part(GDALDataset& dataset, const Frame& frame, const PointsXY& xy, Eigen::Index first,
                 Eigen::Index last, RasterSamples& out) {
    const bool with_slope = out.slope_deg.size() > 0, degrees = frame.crs.geographic();
    const auto& [transform, inverse, crs] = frame;
    Cells cells{*dataset.GetRasterBand(1)};
    for (Eigen::Index i = first; i < last; ++i) {
        if (!std::isfinite(xy(i, 0)))
            continue;
        const double column = inverse[0] + inverse[1] * xy(i, 0) + inverse[2] * xy(i, 1);
        const double row = inverse[3] + inverse[4] * xy(i, 0) + inverse[5] * xy(i, 1);
        out.value(i) =
            std::abs(column) < 1e9 && std::abs(row) < 1e9 ? bilinear(cells, column, row) : nan;
        if (!with_slope || !std::isfinite(out.value(i)))
            continue;
        double width_m = std::abs(transform[1]), height_m = std::abs(transform[5]);
        if (degrees) {
            width_m = geodesic_m(xy(i, 0), xy(i, 1), xy(i, 0) + transform[1], xy(i, 1));
            height_m = geodesic_m(xy(i, 0), xy(i, 1), xy(i, 0), xy(i, 1) + transform[5]);
        }
        const auto found = slope_aspect(cells, column, row, width_m, height_m);
        out.slope_deg(i) = found[0];
        out.aspect_deg(i) = found[1];
    }
}

} // namespace

RasterSamples sample_raster(const std::filesystem::path& file, const PointsXY& lonlat,
                            bool with_slope, const std::string& key) {
    GDALAllRegister();
    const Dataset dataset = open_raster(file, key);
    const Frame frame = frame_of(*dataset, file, key);
    const PointsXY xy = Transformation{Crs{"EPSG:4326", key}, frame.crs}.forward(lonlat);
    const Eigen::Index n = xy.rows();
    RasterSamples out;
    out.value = Eigen::ArrayXd::Constant(n, nan);
    if (with_slope)
        out.slope_deg = out.aspect_deg = out.value;
    constexpr Eigen::Index share = 50000; // worth a handle of its own: GDAL's serve one thread
    sample_part(*dataset, frame, xy, 0, std::min(n, share), out);
    if (n > share)
        tbb::parallel_for(tbb::blocked_range<Eigen::Index>{share, n, share},
                          [&](const tbb::blocked_range<Eigen::Index>& part) {
                              const Dataset own = open_raster(file, key);
                              sample_part(*own, frame, xy, part.begin(), part.end(), out);
                          });
    out.outside = (xy.col(0).isFinite() && !out.value.isFinite()).count();
    return out;
}

} // namespace rillstrand::geo

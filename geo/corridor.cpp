// SPDX-License-Identifier: Apache-2.0
#include "corridor.hpp"

#include "base/text.hpp"
#include "layers_gdal.hpp"

#include <Eigen/Core>

#include <algorithm>
#include <cmath>
#include <limits>
#include <memory>
#include <system_error>

namespace rillstrand::geo {

namespace {
constexpr double most_cells = 50e6;
constexpr int strip_rows = 64;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// A piece of cable between two neighbours, or one channel alone (both ends the same).
struct Piece {
    Eigen::Vector2d a, b;
    double value_a = 0.0, value_b = 0.0;
};

/// Cells of a square, north up; row 0 in the north.
struct Grid {
    double west = 0.0, north = 0.0, cell = 1.0;
    int width = 0, height = 0;

    Eigen::Vector2d centre(int column, int row) const {
        return {west + (column + 0.5) * cell, north - (row + 0.5) * cell};
    }
};

/// Positions in a system of metres or feet, and how many of its units make a metre.
struct Flat {
    OGRSpatialReference crs;
    std::vector<Eigen::Vector2d> at; ///< NaN where a channel has no position
    double units_per_m = 1.0;
};

void transform_all(std::vector<Eigen::Vector2d>& at, const OGRSpatialReference& from,
                   const OGRSpatialReference& to) {
    const std::unique_ptr<OGRCoordinateTransformation> change{
        OGRCreateCoordinateTransformation(&from, &to)};
    for (auto& p : at) {
        if (!std::isfinite(p.x()) || !std::isfinite(p.y()))
            continue;
        int good = 0;
        if (change)
            change->Transform(1, &p.x(), &p.y(), nullptr, nullptr, &good);
        if (good == 0)
            p = {nan, nan};
    }
}

bool is_placed(const Eigen::Vector2d& p) {
    return std::isfinite(p.x()) && std::isfinite(p.y());
}

/// EPSG code of the UTM zone (WGS 84) of a place.
std::string utm_zone(double lon, double lat) {
    const int zone = std::clamp(static_cast<int>(std::floor((lon + 180.0) / 6.0)) + 1, 1, 60);
    return "EPSG:" + std::to_string((lat < 0.0 ? 32700 : 32600) + zone);
}

Flat flatten(const Corridor& corridor) {
    Flat flat;
    flat.crs = coordinate_system(corridor.crs);
    flat.crs.StripVertical();
    for (std::size_t i = 0; i < corridor.x.size(); ++i)
        flat.at.emplace_back(corridor.x[i], corridor.y.at(i));
    const auto first = std::find_if(flat.at.begin(), flat.at.end(), is_placed);
    if (first == flat.at.end())
        throw DataError{"raster along the cable: no channel has a position; leave corridor_m out "
                        "of [layers], or mend the placement"};
    if (flat.crs.IsGeographic() == 0) {
        flat.units_per_m = 1.0 / flat.crs.GetLinearUnits();
        return flat;
    }
    std::vector<Eigen::Vector2d> degrees{*first};
    const OGRSpatialReference degrees_wgs84 = wgs84();
    transform_all(degrees, flat.crs, degrees_wgs84);
    const OGRSpatialReference utm =
        coordinate_system(utm_zone(degrees.front().x(), degrees.front().y()));
    transform_all(flat.at, flat.crs, utm);
    flat.crs = utm;
    return flat;
}

std::vector<Piece> pieces_of(const Flat& flat, const std::vector<double>& value, double max_gap) {
    std::vector<Piece> pieces;
    bool joined = false; // the channel before belongs to a piece already
    for (std::size_t i = 0; i < flat.at.size(); ++i) {
        if (!is_placed(flat.at[i]))
            continue;
        const bool next = i + 1 < flat.at.size() && is_placed(flat.at[i + 1]) &&
                          (flat.at[i + 1] - flat.at[i]).norm() <= max_gap;
        if (next)
            pieces.push_back({flat.at[i], flat.at[i + 1], value[i], value[i + 1]});
        else if (!joined)
            pieces.push_back({flat.at[i], flat.at[i], value[i], value[i]});
        joined = next;
    }
    return pieces;
}

double cell_size(const std::vector<Piece>& pieces, double half_width) {
    std::vector<double> lengths;
    for (const auto& piece : pieces)
        if (const double length = (piece.b - piece.a).norm(); length > 0.0)
            lengths.push_back(length);
    if (lengths.empty())
        return half_width / 10.0;
    const auto middle = lengths.begin() + static_cast<std::ptrdiff_t>(lengths.size() / 2);
    std::nth_element(lengths.begin(), middle, lengths.end());
    return std::clamp(0.5 * *middle, half_width / 20.0, half_width / 2.0);
}

Grid grid_around(const std::vector<Piece>& pieces, double half_width, double cell) {
    Eigen::Array2d low{Eigen::Array2d::Constant(std::numeric_limits<double>::infinity())};
    Eigen::Array2d high{-low};
    for (const auto& piece : pieces) {
        low = low.min(piece.a.array()).min(piece.b.array());
        high = high.max(piece.a.array()).max(piece.b.array());
    }
    low -= half_width;
    high += half_width;
    const Eigen::Array2d size = high - low;
    const double cells = (size.x() / cell + 1.0) * (size.y() / cell + 1.0);
    if (cells > most_cells)
        cell *= std::sqrt(cells / most_cells) * 1.01;
    Grid grid;
    grid.cell = cell;
    grid.west = std::floor(low.x() / cell) * cell;
    grid.north = std::ceil(high.y() / cell) * cell;
    grid.width = static_cast<int>(std::ceil((high.x() - grid.west) / cell));
    grid.height = static_cast<int>(std::ceil((grid.north - low.y()) / cell));
    return grid;
}

/// Rows first_row ... of the raster, a strip at a time.
class Strip {
public:
    Strip(const Grid& grid, int first_row, int rows)
        : m_grid{grid}, m_first{first_row}, m_rows{rows},
          m_value(cells(), std::numeric_limits<float>::quiet_NaN()),
          m_distance(cells(), std::numeric_limits<double>::infinity()) {}

    void paint(const Piece& piece, double half_width) {
        const Eigen::Vector2d low = piece.a.cwiseMin(piece.b), high = piece.a.cwiseMax(piece.b);
        const int top = std::max(m_first, row_of(high.y() + half_width));
        const int bottom = std::min(m_first + m_rows - 1, row_of(low.y() - half_width));
        const int left = std::max(0, column_of(low.x() - half_width));
        const int right = std::min(m_grid.width - 1, column_of(high.x() + half_width));
        for (int row = top; row <= bottom; ++row)
            for (int column = left; column <= right; ++column)
                paint_cell(piece, column, row, half_width);
    }

    std::vector<float>& values() { return m_value; }
    int rows() const { return m_rows; }

private:
    std::size_t cells() const {
        return static_cast<std::size_t>(m_grid.width) * static_cast<std::size_t>(m_rows);
    }
    int row_of(double y) const {
        return static_cast<int>(std::floor((m_grid.north - y) / m_grid.cell));
    }
    int column_of(double x) const {
        return static_cast<int>(std::floor((x - m_grid.west) / m_grid.cell));
    }

    void paint_cell(const Piece& piece, int column, int row, double half_width) {
        const Eigen::Vector2d p = m_grid.centre(column, row);
        const Eigen::Vector2d along = piece.b - piece.a;
        const double length2 = along.squaredNorm();
        const double share =
            length2 > 0.0 ? std::clamp((p - piece.a).dot(along) / length2, 0.0, 1.0) : 0.0;
        if ((p - piece.a - share * along).squaredNorm() > half_width * half_width)
            return;
        const double to_a = (p - piece.a).squaredNorm(), to_b = (p - piece.b).squaredNorm();
        const double nearer = std::min(to_a, to_b);
        const auto at =
            static_cast<std::size_t>(row - m_first) * static_cast<std::size_t>(m_grid.width) +
            static_cast<std::size_t>(column);
        if (nearer >= m_distance[at])
            return;
        m_distance[at] = nearer;
        m_value[at] = static_cast<float>(to_a <= to_b ? piece.value_a : piece.value_b);
    }

    const Grid& m_grid;
    int m_first, m_rows;
    std::vector<float> m_value;
    std::vector<double> m_distance;
};

bool write_strips(GDALRasterBand& band, const Grid& grid, const std::vector<Piece>& pieces,
                  double half_width) {
    for (int first = 0; first < grid.height; first += strip_rows) {
        Strip strip{grid, first, std::min(strip_rows, grid.height - first)};
        for (const auto& piece : pieces)
            strip.paint(piece, half_width);
        if (band.RasterIO(GF_Write, 0, first, grid.width, strip.rows(), strip.values().data(),
                          grid.width, strip.rows(), GDT_Float32, 0, 0, nullptr) != CE_None)
            return false;
    }
    return true;
}

/// A file beside the result, removed at the end whatever happens.
struct Scratch {
    std::filesystem::path file;
    explicit Scratch(std::filesystem::path path) : file{std::move(path)} {}
    ~Scratch() {
        std::error_code ignored;
        std::filesystem::remove(file, ignored);
    }
    Scratch(const Scratch&) = delete;
    Scratch& operator=(const Scratch&) = delete;
    Scratch(Scratch&&) = delete;
    Scratch& operator=(Scratch&&) = delete;
};

void describe(GDALDataset& raster, const Corridor& corridor, const Grid& grid, const Flat& flat) {
    std::array<double, 6> transform{grid.west, grid.cell, 0.0, grid.north, 0.0, -grid.cell};
    raster.SetGeoTransform(transform.data());
    raster.SetSpatialRef(&flat.crs);
    raster.SetMetadataItem("AREA_OR_POINT", "Area");
    raster.SetMetadataItem("TIFFTAG_IMAGEDESCRIPTION", corridor.title.c_str());
    GDALRasterBand& band = *raster.GetRasterBand(1);
    band.SetNoDataValue(nan);
    band.SetDescription(corridor.title.c_str());
    if (!corridor.unit.empty())
        band.SetUnitType(corridor.unit.c_str());
}

void write_raster(const Corridor& corridor, const Grid& grid, const Flat& flat,
                  const std::vector<Piece>& pieces, const std::filesystem::path& file) {
    const GdalOption no_sidecar{"GDAL_PAM_ENABLED", "NO"};
    const GdalFailures failures;
    const Scratch rows{file.string() + ".rows.tif"};
    GdalOptions plain{"COMPRESS=DEFLATE", "SPARSE_OK=TRUE", "BIGTIFF=IF_SAFER",
                      "BLOCKYSIZE=" + std::to_string(strip_rows)};
    Dataset raster{driver("GTiff")->Create(rows.file.c_str(), grid.width, grid.height, 1,
                                           GDT_Float32, plain.get())};
    if (!raster)
        failures.give_up(file);
    describe(*raster, corridor, grid, flat);
    const double half_width = corridor.corridor_m * flat.units_per_m;
    if (!write_strips(*raster->GetRasterBand(1), grid, pieces, half_width))
        failures.give_up(file);
    raster->FlushCache();
    failures.throw_if_any(file);
    GdalOptions cloud{"COMPRESS=DEFLATE", "PREDICTOR=FLOATING_POINT",
                      "BLOCKSIZE=256",    "RESAMPLING=NEAREST",
                      "SPARSE_OK=YES",    "BIGTIFF=IF_SAFER"};
    const Dataset copy{driver("COG")->CreateCopy(file.c_str(), raster.get(), FALSE, cloud.get(),
                                                 nullptr, nullptr)};
    if (!copy)
        failures.give_up(file);
}
} // namespace

CorridorRaster write_corridor(const Corridor& corridor, const std::filesystem::path& file) {
    const Flat flat = flatten(corridor);
    const double half_width = corridor.corridor_m * flat.units_per_m;
    const auto pieces = pieces_of(flat, corridor.value, corridor.max_gap_m * flat.units_per_m);
    if (pieces.empty())
        throw DataError{"raster along the cable: no channel can be brought to a flat coordinate "
                        "system; mend the placement"};
    const double wanted = cell_size(pieces, half_width);
    const Grid grid = grid_around(pieces, half_width, wanted);
    const GdalFailures failures;
    write_raster(corridor, grid, flat, pieces, file);
    failures.throw_if_any(file);
    CorridorRaster result{grid.width, grid.height, grid.cell / flat.units_per_m, {}};
    if (grid.cell > wanted)
        result.warnings.push_back(
            {"corridor-coarsened",
             file.filename().string() + ": cells of " + text::fixed(result.resolution_m, 2) +
                 " m instead of " + text::fixed(wanted / flat.units_per_m, 2) +
                 " m, since the raster would have more than 50 million of them; a wider "
                 "corridor_m shows more"});
    return result;
}

} // namespace rillstrand::geo

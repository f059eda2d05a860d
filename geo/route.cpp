// SPDX-License-Identifier: Apache-2.0
#include "route.hpp"

#include "base/text.hpp"

#include <cpl_error.h>
#include <ogrsf_frmts.h>
#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <memory>

namespace rillstrand::geo {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Vertices of one part: x, y, z in the file's system.
using Part = std::vector<Eigen::Vector3d>;

struct CloseDataset {
    void operator()(GDALDataset* dataset) const { GDALClose(dataset); }
};

class QuietGdal {
public:
    QuietGdal() { CPLPushErrorHandler(CPLQuietErrorHandler); }
    QuietGdal(const QuietGdal&) = delete;
    QuietGdal& operator=(const QuietGdal&) = delete;
    QuietGdal(QuietGdal&&) = delete;
    QuietGdal& operator=(QuietGdal&&) = delete;
    ~QuietGdal() { CPLPopErrorHandler(); }
};

void collect(const OGRGeometry& geometry, std::vector<Part>& parts) {
    const auto type = wkbFlatten(geometry.getGeometryType());
    if (type == wkbLineString) {
        const auto* line = geometry.toLineString();
        Part part;
        for (int i = 0; i < line->getNumPoints(); ++i)
            part.emplace_back(line->getX(i), line->getY(i), line->Is3D() ? line->getZ(i) : nan);
        if (part.size() > 1)
            parts.push_back(std::move(part));
    } else if (type == wkbMultiLineString || type == wkbGeometryCollection) {
        const auto* collection = geometry.toGeometryCollection();
        for (int i = 0; i < collection->getNumGeometries(); ++i)
            collect(*collection->getGeometryRef(i), parts);
    }
}

std::vector<Part> read_parts(OGRLayer& layer) {
    std::vector<Part> parts;
    layer.ResetReading();
    for (auto& feature : layer) {
        const OGRGeometry* geometry = feature->GetGeometryRef();
        if (geometry != nullptr)
            collect(*geometry, parts);
    }
    return parts;
}

double apart(const Eigen::Vector3d& a, const Eigen::Vector3d& b) {
    return geodesic_m(a.x(), a.y(), b.x(), b.y());
}

/// Joins parts end to end, nearest ends first, while ends lie within the tolerance.
Part join(std::vector<Part> parts, const std::string& file) {
    constexpr double tolerance_m = 2.0;
    while (parts.size() > 1) {
        double best_m = std::numeric_limits<double>::infinity();
        std::size_t a = 0, b = 0;
        int how = 0;
        for (std::size_t i = 0; i < parts.size(); ++i)
            for (std::size_t k = i + 1; k < parts.size(); ++k) {
                const std::array<double, 4> gaps{apart(parts[i].back(), parts[k].front()),
                                                 apart(parts[i].back(), parts[k].back()),
                                                 apart(parts[i].front(), parts[k].back()),
                                                 apart(parts[i].front(), parts[k].front())};
                for (int h = 0; h < 4; ++h)
                    if (gaps[static_cast<std::size_t>(h)] < best_m) {
                        best_m = gaps[static_cast<std::size_t>(h)];
                        a = i;
                        b = k;
                        how = h;
                    }
            }
        if (best_m > tolerance_m)
            throw DataError{file + ": its " + std::to_string(parts.size()) +
                            " line parts do not meet (the nearest ends are " +
                            text::fixed(best_m, 1) +
                            " m apart); give one connected line along the cable"};
        if (how == 1 || how == 3)
            std::reverse(parts[b].begin(), parts[b].end());
        Part& first = how < 2 ? parts[a] : parts[b];
        const Part& second = how < 2 ? parts[b] : parts[a];
        first.insert(first.end(), second.begin(), second.end());
        if (how >= 2)
            parts[a] = std::move(parts[b]);
        parts.erase(parts.begin() + static_cast<std::ptrdiff_t>(b));
    }
    return parts.front();
}

} // namespace

LineFromFile read_line(const std::filesystem::path& file, const std::string& fallback_crs,
                       const std::string& key) {
    GDALAllRegister();
    const QuietGdal quiet;
    const std::array<const char*, 7> drivers{"GPKG", "GeoJSON", "ESRI Shapefile", "FlatGeobuf",
                                             "KML",  "GPX",     nullptr};
    const std::unique_ptr<GDALDataset, CloseDataset> dataset{GDALDataset::Open(
        file.c_str(), GDAL_OF_VECTOR | GDAL_OF_READONLY, drivers.data(), nullptr, nullptr)};
    if (!dataset)
        throw DataError{file.string() +
                        ": cannot be read as GeoPackage, GeoJSON, Shapefile, "
                        "FlatGeobuf, KML or GPX; correct " +
                        key};
    LineFromFile line;
    std::vector<Part> parts;
    for (OGRLayer* layer : dataset->GetLayers()) {
        std::vector<Part> found = read_parts(*layer);
        if (found.empty())
            continue;
        std::string crs = fallback_crs;
        if (const OGRSpatialReference* reference = layer->GetSpatialRef()) {
            char* wkt = nullptr;
            const std::array<const char*, 2> options{"FORMAT=WKT2_2019", nullptr};
            reference->exportToWkt(&wkt, options.data());
            if (wkt != nullptr && *wkt != '\0')
                crs = wkt;
            CPLFree(wkt);
        } else {
            line.warnings.push_back({"line-without-crs", file.string() +
                                                             " has no coordinate system; that of "
                                                             "placement.crs was taken"});
        }
        const Crs from{crs, key};
        const Transformation to_wgs84{from, Crs{"EPSG:4326", key}};
        for (auto& part : found) {
            PointsXY xy(static_cast<Eigen::Index>(part.size()), 2);
            for (std::size_t i = 0; i < part.size(); ++i)
                xy.row(static_cast<Eigen::Index>(i)) << part[i].x(), part[i].y();
            const PointsXY lonlat = to_wgs84.forward(xy);
            if (!lonlat.isFinite().all())
                throw DataError{file.string() + ": holds points outside " + from.name() +
                                "; correct its coordinate system"};
            for (std::size_t i = 0; i < part.size(); ++i)
                part[i].head<2>() = lonlat.row(static_cast<Eigen::Index>(i)).matrix();
            parts.push_back(part);
        }
        break; // the first layer with lines is the line
    }
    if (parts.empty())
        throw DataError{file.string() + ": holds no line; give a line layer in " + key};
    const Part joined = join(std::move(parts), file.string());
    line.lonlat.resize(static_cast<Eigen::Index>(joined.size()), 2);
    line.z.resize(line.lonlat.rows());
    for (Eigen::Index i = 0; i < line.lonlat.rows(); ++i) {
        line.lonlat.row(i) = joined[static_cast<std::size_t>(i)].head<2>().transpose().array();
        line.z(i) = joined[static_cast<std::size_t>(i)].z();
    }
    return line;
}

Polyline::Polyline(const PointsXY& xy, const Eigen::ArrayXd& z) {
    std::vector<Eigen::Index> kept{0};
    for (Eigen::Index i = 1; i < xy.rows(); ++i)
        if ((xy.row(i) - xy.row(kept.back())).matrix().norm() > 1e-6)
            kept.push_back(i);
    const auto n = static_cast<Eigen::Index>(kept.size());
    m_xy.resize(n, 2);
    m_z = Eigen::ArrayXd::Constant(n, nan);
    m_measure = Eigen::ArrayXd::Zero(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        m_xy.row(i) = xy.row(kept[static_cast<std::size_t>(i)]);
        if (z.size() == xy.rows())
            m_z(i) = z(kept[static_cast<std::size_t>(i)]);
    }
    m_along_slope = m_z.isFinite().all();
    for (Eigen::Index i = 1; i < n; ++i) {
        const double flat_m = (m_xy.row(i) - m_xy.row(i - 1)).matrix().norm();
        const double rise_m = m_along_slope ? m_z(i) - m_z(i - 1) : 0.0;
        m_measure(i) = m_measure(i - 1) + std::hypot(flat_m, rise_m);
    }
    box_pieces();
}

void Polyline::box_pieces() {
    const Eigen::Index pieces = m_xy.rows() - 1;
    // As many boxes as pieces in a box: the search looks at the square root of the pieces.
    const auto size = static_cast<Eigen::Index>(
        std::ceil(std::sqrt(static_cast<double>(std::max<Eigen::Index>(1, pieces)))));
    for (Eigen::Index k = 0; k < pieces; k += size) {
        const Eigen::Index end = std::min(k + size, pieces);
        const auto part = m_xy.middleRows(k, end - k + 1);
        m_boxes.push_back({k, end, part.col(0).minCoeff(), part.col(1).minCoeff(),
                           part.col(0).maxCoeff(), part.col(1).maxCoeff()});
    }
}

Eigen::Index Polyline::piece_of(double measure_m) const {
    const double* begin = m_measure.data();
    const auto k = std::upper_bound(begin, begin + m_measure.size(), measure_m) - begin - 1;
    return std::clamp<Eigen::Index>(k, 0, m_measure.size() - 2);
}

Eigen::Vector2d Polyline::at(double measure_m) const {
    const Eigen::Index k = piece_of(measure_m);
    const double w = (measure_m - m_measure(k)) / (m_measure(k + 1) - m_measure(k));
    return (m_xy.row(k) + w * (m_xy.row(k + 1) - m_xy.row(k))).matrix().transpose();
}

PointsXY Polyline::at_all(const Eigen::ArrayXd& measures_m) const {
    PointsXY points(measures_m.size(), 2);
    const double* measures = m_measure.data();
    const Eigen::Index last = m_measure.size() - 2;
    const auto fill = [&](const tbb::blocked_range<Eigen::Index>& part) {
        Eigen::Index k = piece_of(measures_m(part.begin()));
        for (Eigen::Index j = part.begin(); j < part.end(); ++j) {
            const double s = measures_m(j);
            if (!(s >= measures[k] || k == 0) || !(s < measures[k + 1] || k == last))
                k = s >= measures[k + 1] && s < measures[std::min(k + 2, last + 1)] ? k + 1
                                                                                    : piece_of(s);
            const double w = (s - measures[k]) / (measures[k + 1] - measures[k]);
            points(j, 0) = m_xy(k, 0) + w * (m_xy(k + 1, 0) - m_xy(k, 0));
            points(j, 1) = m_xy(k, 1) + w * (m_xy(k + 1, 1) - m_xy(k, 1));
        }
    };
    constexpr Eigen::Index enough_for_a_task = 20000;
    tbb::parallel_for(tbb::blocked_range<Eigen::Index>{0, measures_m.size(), enough_for_a_task},
                      fill);
    return points;
}

double Polyline::height_at(double measure_m) const {
    const Eigen::Index k = piece_of(measure_m);
    const double w =
        std::clamp((measure_m - m_measure(k)) / (m_measure(k + 1) - m_measure(k)), 0.0, 1.0);
    return m_z(k) + w * (m_z(k + 1) - m_z(k));
}

Eigen::Vector2d Polyline::direction_at(double measure_m) const {
    const Eigen::Index k = piece_of(measure_m);
    return (m_xy.row(k + 1) - m_xy.row(k)).matrix().transpose().normalized();
}

Nearest Polyline::on_piece(Eigen::Index piece, double x, double y) const {
    const double dx = m_xy(piece + 1, 0) - m_xy(piece, 0), dy = m_xy(piece + 1, 1) - m_xy(piece, 1);
    const double px = x - m_xy(piece, 0), py = y - m_xy(piece, 1);
    const double w = std::clamp((px * dx + py * dy) / (dx * dx + dy * dy), 0.0, 1.0);
    const double off = std::hypot(px - w * dx, py - w * dy);
    // Right of travel: the cross product of direction and offset is negative.
    const double sign = dx * py - dy * px > 0.0 ? -1.0 : 1.0;
    return {m_measure(piece) + w * (m_measure(piece + 1) - m_measure(piece)), sign * off};
}

Nearest Polyline::nearest(double x, double y) const {
    Nearest best{0.0, std::numeric_limits<double>::infinity()};
    for (const Box& box : m_boxes) {
        const double off_x = std::max({box.west - x, 0.0, x - box.east});
        const double off_y = std::max({box.south - y, 0.0, y - box.north});
        if (off_x * off_x + off_y * off_y >= best.offset_m * best.offset_m)
            continue; // nothing in the box can be nearer
        for (Eigen::Index k = box.first_piece; k < box.end_piece; ++k) {
            const Nearest here = on_piece(k, x, y);
            if (std::abs(here.offset_m) < std::abs(best.offset_m))
                best = here;
        }
    }
    return best;
}

std::vector<Nearest> Polyline::near_places(double x, double y, double within_m) const {
    const Eigen::Index n = m_xy.rows() - 1;
    std::vector<Nearest> all;
    for (Eigen::Index k = 0; k < n; ++k)
        all.push_back(on_piece(k, x, y));
    double best = std::numeric_limits<double>::infinity();
    for (const auto& place : all)
        best = std::min(best, std::abs(place.offset_m));
    std::vector<Nearest> places;
    for (Eigen::Index k = 0; k < n; ++k) {
        const auto i = static_cast<std::size_t>(k);
        const double here = std::abs(all[i].offset_m);
        if (here > best + within_m)
            continue;
        if (k > 0 && std::abs(all[i - 1].offset_m) <= here)
            continue;
        if (k + 1 < n && std::abs(all[i + 1].offset_m) < here)
            continue;
        places.push_back(all[i]);
    }
    return places;
}

Polyline Polyline::reversed() const {
    return {m_xy.colwise().reverse(), m_z.reverse()};
}

} // namespace rillstrand::geo

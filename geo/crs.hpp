// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <array>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace rillstrand::geo {

/// Coordinates in columns: x (easting or longitude), y (northing or latitude), whatever the axis
/// order of the coordinate system.
using PointsXY = Eigen::Array<double, Eigen::Dynamic, 2>;

/// A coordinate system by EPSG code, WKT or PROJ text.
class Crs {
public:
    /// @throws DataError if the text is no coordinate system; `key` names where it was said
    Crs(const std::string& definition, const std::string& key);
    Crs(Crs&&) noexcept;
    Crs& operator=(Crs&&) noexcept;
    Crs(const Crs&) = delete;
    Crs& operator=(const Crs&) = delete;
    ~Crs();

    const std::string& definition() const;
    std::string name() const;
    std::string wkt() const; ///< WKT2:2019
    bool geographic() const; ///< x, y are degrees
    /// West, south, east, north in degrees, where the system says so.
    std::optional<std::array<double, 4>> area_of_use() const;

private:
    friend class Transformation;
    struct Data;
    std::unique_ptr<Data> m_data;
};

/// Transforms points between two systems by the best operation that is available offline.
class Transformation {
public:
    Transformation(const Crs& from, const Crs& to);
    Transformation(Transformation&&) noexcept;
    Transformation& operator=(Transformation&&) noexcept;
    Transformation(const Transformation&) = delete;
    Transformation& operator=(const Transformation&) = delete;
    ~Transformation();

    /// NaN or impossible points give NaN.
    PointsXY forward(const PointsXY& points) const;
    PointsXY inverse(const PointsXY& points) const;
    /// Name of the operation used last, and its accuracy in metres (NaN: not stated).
    std::string operation() const;
    double accuracy_m() const;

private:
    PointsXY apply(const PointsXY& points, bool forward) const;
    struct Data;
    std::unique_ptr<Data> m_data;
};

/// Length of the geodesic between two points on WGS 84, m.
/// Source: Karney (2013), J. Geod. 87, 43-55, doi:10.1007/s00190-012-0578-z; error under 15 nm.
double geodesic_m(double lon1, double lat1, double lon2, double lat2);

/// A plane of ground metres around a site: transverse Mercator with unit scale at the middle,
/// enlarged by the height above the ellipsoid. Within 20 km of the middle lengths are right to 5
/// parts in a million.
class GroundPlane {
public:
    /// @param lonlat    degrees, at least one finite point
    /// @param height_m  mean elevation; NaN: 0
    GroundPlane(const PointsXY& lonlat, double height_m);
    PointsXY from_lonlat(const PointsXY& lonlat) const;
    PointsXY to_lonlat(const PointsXY& plane_m) const;

private:
    std::shared_ptr<Transformation> m_transformation;
    double m_scale;
};

} // namespace rillstrand::geo

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "crs.hpp"

#include <Eigen/Core>

#include <filesystem>
#include <string>
#include <vector>

namespace rillstrand::geo {

/// A line of a vector file in longitude and latitude, parts joined where they meet.
struct LineFromFile {
    PointsXY lonlat;
    Eigen::ArrayXd z; ///< NaN where the file has no heights
    Warnings warnings;
};

/// Reads the line of a GeoPackage, GeoJSON, Shapefile, FlatGeobuf, KML or GPX file. Only local
/// files and these drivers; a file without a coordinate system is taken in `fallback_crs`.
/// @param key  names where the file was said, for messages
/// @throws DataError if there is no line, or its parts do not meet
LineFromFile read_line(const std::filesystem::path& file, const std::string& fallback_crs,
                       const std::string& key);

/// A place of a line that is near a point.
struct Nearest {
    double measure_m = 0.0;
    double offset_m = 0.0; ///< distance from the line; positive to the right of travel
};

/// A line in a plane of metres with lengths along it.
class Polyline {
public:
    /// @param xy  at least two different vertices; repeated ones are dropped
    /// @param z   heights: lengths are along the slope where all are finite; may be empty
    Polyline(const PointsXY& xy, const Eigen::ArrayXd& z);
    double length_m() const { return m_measure(m_measure.size() - 1); }
    bool along_slope() const { return m_along_slope; }
    const PointsXY& vertices() const { return m_xy; }
    const Eigen::ArrayXd& measures() const { return m_measure; }
    const Eigen::ArrayXd& heights() const { return m_z; }
    /// Point at a measure; beyond the ends the first and last piece are prolonged.
    Eigen::Vector2d at(double measure_m) const;
    /// The same for many measures, in any order; quick where neighbours follow each other.
    PointsXY at_all(const Eigen::ArrayXd& measures_m) const;
    double height_at(double measure_m) const;
    /// Unit vector of travel.
    Eigen::Vector2d direction_at(double measure_m) const;
    /// The nearest place of the whole line.
    Nearest nearest(double x, double y) const;
    /// All places that are nearer than their surroundings, up to `within_m` farther than the
    /// nearest.
    std::vector<Nearest> near_places(double x, double y, double within_m) const;
    Polyline reversed() const;

private:
    Eigen::Index piece_of(double measure_m) const;
    Nearest on_piece(Eigen::Index piece, double x, double y) const;
    /// What neighbouring pieces keep within, so that a search can pass over them.
    struct Box {
        Eigen::Index first_piece, end_piece;
        double west, south, east, north;
    };
    void box_pieces();
    PointsXY m_xy;
    Eigen::ArrayXd m_z;
    Eigen::ArrayXd m_measure;
    std::vector<Box> m_boxes;
    bool m_along_slope = false;
};

} // namespace rillstrand::geo

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "crs.hpp"
#include "survey.hpp"

namespace rillstrand::geo {

/// Coordinates of the tie points as x, y rows.
PointsXY coordinates_of(const std::vector<TiePoint>& points);

/// Refuses coordinates that cannot be in their system: degrees beyond their range, points outside
/// the area of use, x and y exchanged.
/// @return longitude and latitude
/// @throws DataError with all problems
PointsXY checked_lonlat(const std::vector<TiePoint>& points, const Crs& crs,
                        const Transformation& to_wgs84);

/// Refuses a survey whose lengths say that a unit is wrong.
/// @param ground_m  straight distance between neighbouring tie points
/// @param cable_m   length of cable between them
void refuse_wrong_unit(const std::vector<double>& ground_m, const std::vector<double>& cable_m,
                       const std::string& file);

} // namespace rillstrand::geo

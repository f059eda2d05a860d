// SPDX-License-Identifier: Apache-2.0
#include "tie_checks.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>

namespace rillstrand::geo {

namespace {

/// How far outside its area of use a system is still taken, degrees: cables cross zone edges.
constexpr double margin_deg = 1.5;

bool inside(const std::array<double, 4>& area, double lon, double lat) {
    const auto in_lon = [&](double l) {
        return area[0] <= area[2] ? l >= area[0] - margin_deg && l <= area[2] + margin_deg
                                  : l >= area[0] - margin_deg || l <= area[2] + margin_deg;
    };
    return std::isfinite(lon) && lat >= area[1] - margin_deg && lat <= area[3] + margin_deg &&
           (in_lon(lon) || in_lon(lon + 360.0) || in_lon(lon - 360.0));
}

std::string shown(double x, double y) {
    return text::number(x) + ", " + text::number(y);
}

} // namespace

PointsXY coordinates_of(const std::vector<TiePoint>& points) {
    PointsXY xy(static_cast<Eigen::Index>(points.size()), 2);
    for (std::size_t i = 0; i < points.size(); ++i)
        xy.row(static_cast<Eigen::Index>(i)) << points[i].x, points[i].y;
    return xy;
}

PointsXY checked_lonlat(const std::vector<TiePoint>& points, const Crs& crs,
                        const Transformation& to_wgs84) {
    const PointsXY xy = coordinates_of(points);
    const PointsXY lonlat = to_wgs84.forward(xy);
    PointsXY exchanged = xy;
    exchanged.col(0) = xy.col(1);
    exchanged.col(1) = xy.col(0);
    const PointsXY other = to_wgs84.forward(exchanged);
    const auto area = crs.area_of_use();
    Problems problems;
    std::size_t more = 0;
    for (Eigen::Index i = 0; i < xy.rows(); ++i) {
        const TiePoint& tie = points[static_cast<std::size_t>(i)];
        const bool degrees_wrong =
            crs.geographic() && (std::abs(xy(i, 0)) > 360.0 || std::abs(xy(i, 1)) > 90.0);
        const bool good = !degrees_wrong && (area ? inside(*area, lonlat(i, 0), lonlat(i, 1))
                                                  : std::isfinite(lonlat(i, 0)));
        if (good)
            continue;
        if (problems.list().size() >= 10) {
            ++more;
            continue;
        }
        const bool swap = area && inside(*area, other(i, 0), other(i, 1));
        const bool looks_degrees =
            !crs.geographic() && std::abs(xy(i, 0)) <= 180.0 && std::abs(xy(i, 1)) <= 90.0;
        problems.add(tie.place + ": tie point '" + tie.label + "' at " + shown(tie.x, tie.y) +
                     " lies outside the area of " + crs.name() +
                     (std::isfinite(lonlat(i, 0)) && !degrees_wrong
                          ? " (it would be at longitude " + text::fixed(lonlat(i, 0), 4) +
                                ", latitude " + text::fixed(lonlat(i, 1), 4) + ")"
                          : "") +
                     (swap ? "; x and y look exchanged: x is easting or longitude"
                      : looks_degrees
                          ? "; these look like degrees: set placement.crs to \"EPSG:4326\""
                          : "; correct placement.crs (zone?) or the coordinates"));
    }
    if (more > 0)
        problems.add("and " + std::to_string(more) + " more tie points");
    problems.throw_if_any();
    return lonlat;
}

void refuse_wrong_unit(const std::vector<double>& ground_m, const std::vector<double>& cable_m,
                       const std::string& file) {
    std::vector<double> ratios;
    for (std::size_t i = 0; i < ground_m.size(); ++i)
        if (ground_m[i] > 0.0)
            ratios.push_back(cable_m[i] / ground_m[i]);
    if (ratios.size() < 2)
        return;
    const auto middle = ratios.begin() + static_cast<std::ptrdiff_t>(ratios.size() / 2);
    std::nth_element(ratios.begin(), middle, ratios.end());
    const double ratio = *middle;
    const auto near = [ratio](double value) { return std::abs(ratio / value - 1.0) < 0.15; };
    std::string hint;
    if (near(3.2808))
        hint = "fibre distances look like feet: see record.distance_unit and fibre_m";
    if (near(0.3048))
        hint = "coordinates look like feet: choose a coordinate system in feet";
    if (near(1000.0))
        hint = "coordinates look like kilometres; give them in the system's unit";
    if (near(0.001))
        hint = "fibre distances look like kilometres; give fibre_m in metres";
    if (hint.empty())
        return;
    throw DataError{file + ": there are " + text::number(std::round(ratio * 1000.0) / 1000.0) +
                    " fibre metres to a ground metre; " + hint};
}

} // namespace rillstrand::geo

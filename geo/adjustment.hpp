// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "route.hpp"

#include <optional>
#include <string>
#include <vector>

namespace rillstrand::geo {

/// A tie point ready for the adjustment.
struct Tie {
    std::string label, place;
    double path_m = 0.0;    ///< length of cable over ground, see FibreMap
    Eigen::Vector2d xy;     ///< in the plane of ground metres
    double sd_m = 0.0;      ///< of each coordinate
    double path_sd_m = 0.0; ///< of the mark on the fibre
    double measure_m = 0.0; ///< along the route
    double offset_m = 0.0;  ///< from the route
    double residual_m = 0.0;
    bool used = true;
    std::string reason;
};

/// Places along the path in the plane, with variances along and across the line.
struct PlacedPath {
    PointsXY xy;
    Eigen::ArrayXd along_variance, across_variance;
    Eigen::ArrayXd ground_m; ///< measure along the route, or length along the chain of places
};

/// Finds each tie point's place on a route, in the order of the cable: where the line winds, the
/// nearest place may be on another bend. Turns the route round if the ties run against it.
/// @return the route in the direction of the cable
Polyline match_to_route(const Polyline& route, std::vector<Tie>& ties, double max_slack);

/// Sets ties aside that the others contradict, estimates how slack wanders, and places the path.
class Adjustment {
public:
    /// @param ties   by path; `used` and `reason` are written
    /// @param route  absent: straight or curved between the ties as they say
    Adjustment(std::vector<Tie>& ties, std::optional<Polyline> route);
    /// @param path_m  increasing
    PlacedPath place(const Eigen::ArrayXd& path_m) const;
    const Warnings& warnings() const { return m_warnings; }

private:
    void set_aside_far_from_route();
    void set_aside_blunders();
    void note_residuals();
    std::vector<std::size_t> used() const;
    std::vector<Tie>& m_ties;
    std::optional<Polyline> m_route;
    double m_across_variance = 0.0;
    Warnings m_warnings;
};

} // namespace rillstrand::geo

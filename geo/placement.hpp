// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "campaign/campaign.hpp"
#include "record/source.hpp"

#include <Eigen/Core>

#include <string>
#include <vector>

namespace rillstrand::geo {

/// Why a channel has no position.
enum class NoPosition { placed, beyond_survey, slack_refused };

/// Where every channel lies. Arrays have one entry a channel; NaN where there is no position.
struct ChannelPositions {
    Eigen::ArrayXd x, y;     ///< in output_crs: easting and northing, or longitude and latitude
    Eigen::ArrayXd z;        ///< elevation; NaN where no source of heights says it
    Eigen::ArrayXd lon, lat; ///< WGS 84, degrees
    Eigen::ArrayXd position_sd_m; ///< sqrt(var_x + var_y)
    Eigen::ArrayXd along_sd_m, across_sd_m;
    Eigen::ArrayXd ground_m;              ///< distance over the ground along the cable's line
    Eigen::ArrayXd station_m;             ///< chainage along the river, NaN without one
    Eigen::ArrayXd offset_m;              ///< from the river, positive to the right of its travel
    Eigen::ArrayXd slope_deg, aspect_deg; ///< of the elevation; aspect clockwise from north
    std::vector<int> leg;
    std::vector<NoPosition> reason;
    struct Sampled {
        std::string name;
        Eigen::ArrayXd values;
    };
    std::vector<Sampled> rasters;
};

struct PlacedTie {
    std::string label, place;
    double fibre_m = 0.0;
    double x = 0.0, y = 0.0, z = 0.0; ///< in output_crs
    double lon = 0.0, lat = 0.0;
    double sd_m = 0.0;
    double residual_m = 0.0; ///< along the line: surveyed minus expected from the others
    double offset_m = 0.0;   ///< from the route, positive to the right; NaN without a route
    double slack = 0.0; ///< fibre metres per ground metre to the next used one; NaN at the last
    bool used = true;
    std::string reason; ///< why it was set aside
};

/// The cable of one stretch on the ground.
struct CableLine {
    std::string stretch;
    double from_m = 0.0, to_m = 0.0;
    double slack = 0.0;
    std::vector<Eigen::Vector3d> vertices; ///< x, y, z in output_crs
};

struct Placement {
    ChannelPositions channels;
    std::vector<PlacedTie> ties;
    std::vector<CableLine> cable;
    std::string crs, crs_name; ///< of the survey
    std::string output_crs, output_crs_name, output_wkt;
    std::string operation;             ///< to WGS 84, as PROJ names it
    double operation_accuracy_m = 0.0; ///< NaN: not stated
    bool has_route = false;
    std::string lengths;                     ///< `along the slope` or `horizontal`
    double first_lon = 0.0, first_lat = 0.0; ///< of the first tie point, to look at
    double slack_mean = 0.0;                 ///< of the pieces that are used
    double local_scale_mm_km = 0.0;          ///< NaN without a local grid
    double residual_rms_m = 0.0;
    Eigen::Index unplaced = 0;
    Warnings warnings;
};

/// Puts every channel on the ground.
///
/// The length over the ground is estimated from all tie points together: slack wanders along the
/// cable as a random walk whose size is told from the tie points (stats::walk_sizes), each tie
/// point weighs by its sd. A tie point that the others contradict by more than five standard
/// deviations is set aside by name. With a route the cable lies on it; without one it runs between
/// the tie points as straight or as curved as they say.
/// @param source  for [[mark]]; may be nullptr where there is none
/// @throws DataError with what cannot be placed and why
Placement place(const campaign::Campaign& campaign, const Eigen::ArrayXd& distance_m,
                const record::Source* source);

/// All problems of the placement's files that show without the record.
std::vector<std::string> check_placement(const campaign::Campaign& campaign);

} // namespace rillstrand::geo

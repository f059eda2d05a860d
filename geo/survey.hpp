// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "campaign/campaign.hpp"
#include "crs.hpp"

#include <string>
#include <vector>

namespace rillstrand::geo {

/// A fibre distance whose coordinates were surveyed.
struct TiePoint {
    std::string label;
    std::string place; ///< `file:line`, for messages
    double fibre_m = 0.0;
    double fibre_sd_m = 0.0; ///< of the mark on the fibre
    double x = 0.0, y = 0.0; ///< in the survey's system
    double z = 0.0;          ///< NaN where not surveyed
    double sd_m = 0.0;       ///< one standard deviation of each horizontal coordinate
    bool sd_said = false;
};

struct Survey {
    std::vector<TiePoint> points; ///< by fibre distance
    Warnings warnings;
};

/// What is taken for a tie point without sd_m: a handheld receiver under an open sky (common
/// practice, no source).
inline constexpr double default_tie_sd_m = 2.0;

/// Reads the tie points from delimited text or a vector file.
/// @throws DataError with all problems: columns, numbers, sd, fibre distances given twice
Survey read_survey(const campaign::Campaign& campaign);

} // namespace rillstrand::geo

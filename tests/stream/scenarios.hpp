// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/stream.hpp"
#include "stream_physics.hpp"

#include <string>

namespace rillstrand::stream::scenarios {

/// One invented campaign: what is true and what the interpretation is told.
struct Campaign {
    physics::Record truth;
    physics::Stream stream;
    physics::Cable cable;
    StreamInput input;
    double length_m = 0.0;
};

/// What a campaign is like.
enum class Sort {
    plain,   ///< 3 days, groundwater given
    nothing, ///< nothing comes in; shade, sun, pool, dry and buried cable, a step loss
    hard, ///< groundwater unknown, contrast changes sign, tributary, against the fibre, gaps, dead
          ///< piece
    many, ///< ten days, many small inflows, spots, diffuse gains
    winter, ///< groundwater warmer, ice
    small   ///< 300 m, 2 days, one or two inflows: for the unit tests
};

/// @param with_inflows  false: the same campaign with nothing coming in (for `small`)
Campaign make(Sort sort, unsigned seed, bool with_inflows = true);

/// What came of one campaign.
struct Tally {
    double km = 0.0;
    int campaigns = 0, campaigns_with_false = 0, false_inflows = 0;
    int over3 = 0, over3_found = 0, one3 = 0, one3_found = 0, half1 = 0, half1_found = 0;
    int missed_over_limit = 0, missed = 0;
    int shares = 0, shares_in = 0, sources = 0, sources_in = 0, places = 0, places_in = 0,
        flows = 0, flows_in = 0;
    int spots = 0, spots_found = 0, spots_as_inflow = 0, gains = 0, gains_found = 0,
        gain_shares_in = 0;
    int tributaries = 0, tributaries_in = 0;
    std::vector<double> share_errors, place_errors, source_errors, bound_ratio2;
    double seconds = 0.0;
};
void score(const Campaign& campaign, const StreamFindings& findings, Tally& tally,
           bool talk = false);

/// Smallest standard deviation of a share that any estimator can have (Cramer and Rao), with the
/// background's level and slope unknown at every time in a window of 60 m a side, the mixing zone
/// left out and the inflow temperature known.
double bound(const Campaign& campaign, const physics::TrueInflow& inflow);

} // namespace rillstrand::stream::scenarios

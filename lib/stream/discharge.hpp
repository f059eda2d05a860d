// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/stream.hpp"

namespace rillstrand::stream {

/// One gain of water along the reach: point (from = to) or spread.
struct Gain {
    double from_m = 0.0, to_m = 0.0; ///< place
    double log_gain = 0.0;           ///< -ln(1 - f)
    double log_gain_sd = 0.0;
};

struct Gauged {
    double place_m = 0.0;
    double discharge_m3s = 0.0;
    double sd_m3s = 0.0;
};

/// Discharge along a reach.
struct DischargeLine {
    bool known = false;
    Eigen::ArrayXd discharge_m3s, sd_m3s; ///< at the places asked for
    Eigen::ArrayXd gain_m3s, gain_sd_m3s; ///< of each gain
};

/// Joins gaugings and gains: ln Q grows by -ln(1 - f) at each inflow, so that with normal errors
/// everything is one linear least-squares problem; mass balance holds by construction.
///
/// @param place_m  where discharge is asked for
DischargeLine discharge_line(const Eigen::ArrayXd& place_m, const std::vector<Gain>& gains,
                             const std::vector<Gauged>& gaugings);

/// What two gaugings say of the piece between them against what temperature found.
std::vector<Closure> closures(const std::vector<Gain>& gains, std::vector<Gauged> gaugings);

} // namespace rillstrand::stream

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/background.hpp"
#include "stream/pieces.hpp"

#include <vector>

namespace rillstrand::stream {

/// What something must gain (twice the log likelihood, for a step its z squared) to be believed.
struct ScanLevels {
    double step_gain = 20.0;
    double fall_gain = 20.0; ///< a step the wrong way: no groundwater does that
    double box_gain = 24.0;
    double kink_gain = 20.0;
    double plume_gain = 14.0;   ///< for a plume's size and length
    double slow_gain = 7.0;     ///< for a length alone
    double widest_box_m = 25.0; ///< in the scan; wider ones come from a step and its undoing
    double widest_join_m = 90.0;
    double reach_m = 120.0; ///< how far below its place a shape is looked at
    std::size_t most_pieces = 80;
};

/// Levels for a reach, such that one without inflows reports a step with the chance `family`.
///
/// Gaussian maxima over independent places: the number of places is that of channels no nearer than
/// half the spatial response, times the three shapes of steps; one-sided; the mean number of false
/// steps is set to -ln(1 - family) (Bonferroni, a bound whatever the correlation).
ScanLevels make_levels(const Eigen::ArrayXd& place_m, double response_sd_m, double family);

/// z beyond which one standard normal in `count` falls with chance `family`, one-sided.
double maximum_z(double count, double family);

/// Finds pieces one by one, each the one that gains most given those before (orthogonal
/// forward selection), refines places and plumes, then takes out what no longer earns its place.
///
/// @param start  pieces to begin with; declared ones stay
std::vector<Piece> find_pieces(const Eigen::ArrayXd& place_m, const Eigen::ArrayXd& profile,
                               const Eigen::ArrayXd& variance, double roughness2,
                               double response_sd_m, const ScanLevels& levels,
                               std::vector<Piece> start);

/// Standard deviation of a step just before each channel, in the profile's unit, given pieces.
Eigen::ArrayXd step_sd(const Eigen::ArrayXd& place_m, const Whitener& whitener,
                       const std::vector<Piece>& pieces, double response_sd_m, double reach_m);

/// Where a step lies and how its plume mixes in, averaged over what the profile leaves open.
struct StepPosterior {
    double at_m = 0.0, at_sd_m = 0.0;
    double low_m = 0.0, high_m = 0.0;   ///< 95 %
    double value = 0.0, value_sd = 0.0; ///< of the step, mixing averaged; model sd (not scaled)
    double mixing_m = 0.0;              ///< most likely e-folding length, 0 none
    double plume = 0.0;                 ///< its size over the step's
};
/// @param which  index of the piece (a step) among pieces
StepPosterior locate_step(const Eigen::ArrayXd& place_m, const Eigen::ArrayXd& profile,
                          const Whitener& whitener, const std::vector<Piece>& pieces,
                          std::size_t which, double response_sd_m, double reach_m);

} // namespace rillstrand::stream

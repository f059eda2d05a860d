// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <Eigen/Core>

namespace rillstrand::bed {

/// Metres of fibre in one metre of height: sqrt((pi D)^2 + p^2) / p of a helix, 1 without one.
/// D is the diameter to the fibre's centre line.
double fibre_per_height(const std::optional<campaign::Winding>& winding);

/// Depth under the datum of each fibre distance, positive down, m.
Eigen::ArrayXd depths_m(const campaign::Bed& config, const Eigen::ArrayXd& fibre_m);

/// White noise of one sample of a series, from third differences of neighbours: what is smooth in
/// time drops out. Robust (median of sizes); NaN with fewer than eight of them.
double white_noise_K(const Eigen::ArrayXd& time_s, const Eigen::ArrayXd& values, double step_s);

/// Every series through a Gaussian window by local straight lines, the same for all places: a mean
/// over time obeys the same equation of heat, and noise of single samples in what drives a fit
/// would make it sluggish. NaN where a third of the window's weight is missing.
/// @param sigma_s  sd of the window
Eigen::ArrayXXd smoothed_in_time(const Eigen::ArrayXd& time_s, const Eigen::ArrayXXd& values,
                                 double sigma_s);

} // namespace rillstrand::bed

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "snow/snow.hpp"

namespace rillstrand::snow {

/// Share of a neighbour's temperature that the instrument's spatial response lets into a channel:
/// the lower third of the slopes of covered channels on the bare ones beside them (those that are
/// bare after all have the greatest slopes).
/// @return 0 where fewer than 12 channel-days show an edge; at most 0.4
double find_leak(const SnowInput& input, const Days& days, const Eigen::ArrayXXd& probability);

/// Temperatures with the share of bare neighbours taken out:
/// (T_j - s (b_j-1 T_j-1 + b_j+1 T_j+1)) / (1 - s (b_j-1 + b_j+1)), b the probability of bare
/// ground that day. Where all are bare nothing changes; a covered channel between bare ones loses
/// their swing; covered neighbours are left alone, since their own swing is small.
Eigen::ArrayXXf sharpened(const SnowInput& input, double leak, const Days& days,
                          const Eigen::ArrayXXd& probability);

} // namespace rillstrand::snow

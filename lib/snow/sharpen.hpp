// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "snow/snow.hpp"

namespace rillstrand::snow {

/// Share of a neighbour's temperature that the instrument's spatial response lets into a channel:
/// the median slope of covered channels on the bare ones beside them.
/// @return 0 where fewer than 12 channel-days show an edge; at most 0.4
double find_leak(const SnowInput& input, const Days& days, const Eigen::ArrayXXd& probability);

/// Temperatures with the neighbours' share taken out: (T_j - s (T_j-1 + T_j+1)) / (1 - 2 s). Right
/// to second order in s; white noise grows by sqrt(1 + 2 s^2) / (1 - 2 s). At the ends and beside
/// missing values the channel stands for its neighbour.
Eigen::ArrayXXf sharpened(const SnowInput& input, double leak);

} // namespace rillstrand::snow

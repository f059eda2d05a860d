// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <vector>

namespace rillstrand::quality {

/// The two legs of a loop, which lie on one ground line, compared by their mean temperatures.
struct LegComparison {
    Eigen::Index places = 0;   ///< channels of the first leg that have a second one beside them
    double difference_K = 0.0; ///< second minus first, mean; NaN where there is no place
    double rmse_K = 0.0;       ///< root mean square of the difference
    double largest_K = 0.0;    ///< difference where the legs part most, after the mean is taken off
    double largest_fibre_m = 0.0; ///< where that is, on the first leg
};

/// @param fibre_m     of each channel, increasing
/// @param ground_m    distance over ground, NaN without a position
/// @param mean_degC   over all times, NaN where missing
/// @param leg         1 or 2
LegComparison compare_legs(const Eigen::ArrayXd& fibre_m, const Eigen::ArrayXd& ground_m,
                           const Eigen::ArrayXd& mean_degC, const std::vector<int>& leg);

} // namespace rillstrand::quality

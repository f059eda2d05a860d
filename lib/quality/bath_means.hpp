// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "quality/adjust.hpp"

namespace rillstrand::quality {

enum class BathQuantity { temperature, log_ratio, log_ratio_both_ways };

/// Each trace's mean over each bath.
struct BathMeans {
    Eigen::ArrayXd distance_m; ///< weighted middle of each bath
    Eigen::ArrayXXd mean;      ///< row = time, column = bath; NaN where all are missing
    Eigen::ArrayXXd variance;  ///< of the mean by shot noise at unit scale; log ratios only
    Eigen::ArrayXd noise;      ///< of a trace's mean, from second differences in time
};

BathMeans bath_means(const record::Source& source, const std::vector<AdjustBath>& baths,
                     BathQuantity quantity);

/// ln(P_s / P_as) of a block, or the mean of it and the reverse one; NaN where a power is missing
/// or not over 0. `variance` is that of shot noise at unit scale: 1 / P_s + 1 / P_as.
void read_log_ratio(const record::Source& source, bool both_ways, Eigen::Index i_time,
                    Eigen::Index j_place, Eigen::Ref<Eigen::ArrayXXd> logarithm,
                    Eigen::Ref<Eigen::ArrayXXd> variance);

/// White noise of a series from its second differences: median(|x1 - 2 x2 + x3|) / (0.6745 sqrt 6).
double second_difference_noise(const Eigen::ArrayXd& series);

} // namespace rillstrand::quality

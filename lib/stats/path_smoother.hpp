// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <vector>

namespace rillstrand::stats {

/// How a quantity changes along a path: its rate wanders as a random walk, and the quantity itself
/// has a random walk of its own on top (slack that is taken up at one place).
struct WalkSize {
    double rate = 0.0;  ///< variance of the rate per unit of path
    double white = 0.0; ///< variance of the quantity's own walk per unit of path
};

/// Observations of a quantity at places along a path, in order.
struct PathData {
    Eigen::ArrayXd at;       ///< place, increasing (equal places are allowed)
    Eigen::ArrayXd value;    ///< observed
    Eigen::ArrayXd variance; ///< of the observation; infinite: left out
};

/// What is believed of the rate before any observation, and of the size of the walks.
struct PathPrior {
    double rate_mean = 0.0;
    double rate_sd = 1.0;
    double log_rate_step = 0.0; ///< log of the sd by which the rate wanders over `scale`
    double log_rate_step_sd = 1.0;
    double log_white_step = 0.0; ///< log of the sd of the own walk over `scale`
    double log_white_step_sd = 1.0;
    double scale = 100.0; ///< length of path on which the two steps are stated
};

/// Smoothed values and their variance at places.
struct PathEstimate {
    Eigen::ArrayXd mean;
    Eigen::ArrayXd variance;
    Eigen::ArrayXd rate;
};

/// Log of the likelihood of the data (the first value enters with a flat prior).
double path_log_likelihood(const PathData& data, const PathPrior& prior, const WalkSize& size);

/// Values at `query` (increasing) given all data: Kalman filter and Rauch-Tung-Striebel smoother.
/// Source: Rauch, Tung and Striebel (1965), AIAA J. 3, 1445-1450, doi:10.2514/3.3166.
PathEstimate smooth_path(const PathData& data, const PathPrior& prior, const WalkSize& size,
                         const Eigen::ArrayXd& query);

/// A walk size and how much it is believed.
struct WeightedSize {
    WalkSize size;
    double weight = 0.0;
};

/// Posterior of the walk sizes on a grid, for series that share them: sizes of at least one
/// hundredth of the belief, weights sum to 1. Averaging over it carries the doubt about the sizes
/// into the variance.
std::vector<WeightedSize> walk_sizes(const std::vector<PathData>& series, const PathPrior& prior);

/// smooth_path averaged over walk sizes.
PathEstimate smooth_path(const PathData& data, const PathPrior& prior,
                         const std::vector<WeightedSize>& sizes, const Eigen::ArrayXd& query);

/// Each observation predicted from all the others.
struct LeftOut {
    Eigen::ArrayXd predicted;
    Eigen::ArrayXd variance; ///< of the observation about the prediction
};
LeftOut leave_one_out(const PathData& data, const PathPrior& prior,
                      const std::vector<WeightedSize>& sizes);

} // namespace rillstrand::stats

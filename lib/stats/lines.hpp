// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

/// Straight lines y = intercept + slope x. All arrays of one fit have the same size, at least 3,
/// and hold no NaN.
namespace rillstrand::stats {

struct Line {
    double intercept = 0.0;
    double slope = 0.0;
    double intercept_sd = 0.0; ///< NaN where the estimator has none
    double slope_sd = 0.0;
};

/// Least squares of y on x; sds from the residuals with n - 2 degrees of freedom.
Line least_squares(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y);
/// Least squares of x on y, turned round.
Line inverse_least_squares(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y);
/// Least squares of y on x with weights 1 / sd^2; sds from the weights alone.
Line weighted_least_squares(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y,
                            const Eigen::ArrayXd& weight);
/// Errors in both axes with one ratio of variances, delta = var_y / var_x; 1 is orthogonal.
Line deming(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y, double delta);
/// Geometric mean of the two least-squares slopes (reduced major axis).
Line reduced_major_axis(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y);

/// Median of the slopes of all pairs; intercept: median of y minus slope times median of x.
/// Source: Sen (1968), J. Am. Stat. Assoc. 63, 1379-1389; interval by the normal approximation of
/// Kendall's statistic at the level given.
struct TheilSen {
    double intercept = 0.0;
    double slope = 0.0;
    double slope_low = 0.0, slope_high = 0.0;
};
TheilSen theil_sen(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y, double level = 0.95);

/// Line with errors in both axes, each point with its own.
struct YorkLine {
    Line line;                ///< sds at the adjusted points
    double covariance = 0.0;  ///< of intercept and slope
    double chi_square = 0.0;  ///< sum of the weighted squared residuals
    double probability = 0.0; ///< of a larger chi_square, n - 2 degrees of freedom
    int iterations = 0;
};

/// @param weight_x, weight_y  1 / variance of each coordinate, positive
/// @param correlation         of the two errors of each point, empty: none
/// Source: York, Evensen, Lopez Martinez and De Basabe Delgado (2004), Am. J. Phys. 72, 367-375,
/// doi:10.1119/1.1632486.
YorkLine york(const Eigen::ArrayXd& x, const Eigen::ArrayXd& weight_x, const Eigen::ArrayXd& y,
              const Eigen::ArrayXd& weight_y, const Eigen::ArrayXd& correlation = {});

} // namespace rillstrand::stats

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/solve.hpp"

#include <string>
#include <vector>

namespace rillstrand::stream {

/// One weighting's numbers for every piece.
struct Estimate {
    Eigen::VectorXd value, sd; ///< of the first column of each piece, in the profile's unit
    Eigen::MatrixXd covariance;
    double excess = 1.0;
};
Estimate estimate(const Frame& frame, const Reading& reading, const std::vector<Piece>& pieces);

enum class Verdict { inflow, spot, declared, loss, sun, damped, dry, local, unexplained };

/// What a piece is, and why.
struct Judged {
    std::size_t piece = 0;
    Verdict verdict = Verdict::inflow;
    std::vector<std::string> why;
    double value = 0.0, sd = 0.0; ///< in the profile's unit, others of a cluster added
    double mean_step_K = 0.0;     ///< mean of the step or deviation at the cable
    bool constant_untold = false; ///< a loss constant in time could not be told apart
};

/// Tells inflows and spots from what the cable and the light do.
///
/// A step is compared between weightings: one that shuts constants out (a loss at a splice vanishes
/// in it), one of nights alone (sun and shade vanish in it). A deviation that returns is a spot if
/// it is narrow, draws the cable toward the inflow's temperature and follows the contrast; else the
/// cable is dry (its daily range grows), buried (it shrinks without a shift of the mean) or in the
/// sun.
std::vector<Judged> judge(const Frame& frame, const Patterns& patterns, const Solution& solution,
                          const std::optional<Eigen::ArrayXd>& inflow_degC);

/// Mean over the cable from `from_m` to `to_m` less the straight line between its flanks, in time.
Eigen::ArrayXd deviation(const Frame& frame, double from_m, double to_m);
/// Mean of `span_m` beside a place at each time, upstream (side < 0) or downstream of a margin.
Eigen::ArrayXd beside(const Frame& frame, double place_m, double margin_m, double span_m);

} // namespace rillstrand::stream

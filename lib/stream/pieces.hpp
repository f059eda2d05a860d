// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <vector>

namespace rillstrand::stream {

/// One thing along the fibre, as a shape in a profile.
struct Piece {
    enum class Type {
        step, ///< from here on
        box,  ///< here only
        kink  ///< the background's slope changes
    } type = Type::step;
    double at_m = 0.0; ///< place; a box: its upstream edge
    double to_m = 0.0; ///< box: its downstream edge
    double mixing_m =
        0.0; ///< step: a plume of this e-folding length beside it, with its own size; 0: none
    bool far_bank = false; ///< the cable sees nothing of it at first: step and plume are one shape
    double curve = 0.0;    ///< own size, by which the shape bends in a logarithmic profile
    bool declared = false; ///< known surface water: stays whatever its size
    double score = 0.0;    ///< |z| with which it came in

    Eigen::Index width() const { return type == Type::step && mixing_m > 0.0 && !far_bank ? 2 : 1; }
};

/// A step at 0 seen through a Gaussian of standard deviation `sd_m`.
double seen_step(double x_m, double sd_m);
/// A step at 0 that decays below with e-folding length `mixing_m`, seen the same way.
double seen_plume(double x_m, double mixing_m, double sd_m);

/// Columns of the pieces, in order; a step with a plume has two: the step, then the plume.
Eigen::MatrixXd make_columns(const std::vector<Piece>& pieces, const Eigen::ArrayXd& place_m,
                             double response_sd_m);
/// First column of each piece.
std::vector<Eigen::Index> first_columns(const std::vector<Piece>& pieces);

} // namespace rillstrand::stream

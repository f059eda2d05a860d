// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

namespace rillstrand::bed {

/// Flux that bends a mean profile.
struct SteadyFlux {
    double flux_m_s = 0.0; ///< positive down; NaN where the profile tells none
    double sd_m_s = 0.0;
};

/// Least squares of T = T0 + (TL - T0) (exp(beta x) - 1) / (exp(beta) - 1) over depth, T0, TL and
/// beta free. The sd comes from the curvature of the misfit around its least, the scatter of the
/// profile (at least scatter_K) and the conductivity's.
/// @param depth_m     increasing, at least four
/// @param mean_degC   of a window long against the time that heat needs through the depths
/// Source: Bredehoeft & Papadopulos (1965), Water Resour. Res. 1, 325-328,
/// doi:10.1029/WR001i002p00325.
SteadyFlux steady_flux(const Eigen::ArrayXd& depth_m, const Eigen::ArrayXd& mean_degC,
                       double scatter_K, double conductivity_W_m_K, double conductivity_share);

} // namespace rillstrand::bed

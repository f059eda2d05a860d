// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "bed/march.hpp"

#include <Eigen/Core>

namespace rillstrand::bed {

/// How far the stated properties may be off, one standard deviation as a share. What a careful
/// sampler of a streambed reaches: common practice, no source.
struct Trust {
    double conductivity = 0.05;       ///< of the whole rod
    double conductivity_layer = 0.05; ///< of one depth against the whole
    double capacity = 0.03;
    double capacity_layer = 0.02;
    double averaging = 0.3;    ///< of the height that the fibre averages over
    double datum_m = 0.01;     ///< metres of height, of the bed's surface on the rod
    double depth_scale = 0.01; ///< of pitch, diameter and sampling interval together
};

/// One profile, its stated properties, and how far to trust them.
struct FitInput {
    Profile profile;
    double conductivity_W_m_K = 1.8;
    double capacity_J_m3_K = 2.8e6;
    Eigen::ArrayXd noise_K; ///< first guess of one sample's white noise, size of profile.depth_m
    double boundary_noise_K = 0.05;
    Trust trust;
};

/// Flux through time, and what else the fit has learnt.
struct FitResult {
    Layout layout;
    Eigen::VectorXd unknowns;
    Eigen::VectorXd flux_unit;       ///< of the knots, in 0.1 m/d
    Eigen::MatrixXd flux_covariance; ///< of the knots, in (0.1 m/d)^2, properties included
    double diffusivity_m2_s = 0.0;   ///< mean over depth
    double diffusivity_sd_m2_s = 0.0;
    double noise_K = 0.0;         ///< root mean square residual
    double residual_spread = 1.0; ///< variance of residuals' means over that of white noise
    double variability_m_d = 0.0; ///< change of flux to expect in one day, one sd
    double offset_sd_K = 0.0;     ///< of the places against one another
    bool converged = false;

    /// Mean flux and its sd in m/s over [begin, end).
    struct Mean {
        double flux_m_s = 0.0, sd_m_s = 0.0;
    };
    Mean mean(double begin_s, double end_s, double depth_scale) const;
};

/// Fits flux through time, properties by depth, offsets of places and slow errors of both
/// boundaries to all depths at once.
///
/// Gauss-Newton on the misfit with priors: properties around the stated ones; flux a random walk
/// whose steps have heavy tails (Student's t, 4 degrees of freedom), so that floods pass while calm
/// days stay calm; offsets and boundary errors around zero. The walk's size, the noise and the
/// offsets' spread come from the data (expectation maximisation). Residuals that are alike through
/// time or over depth stand for fewer samples.
/// Source: equations as in march.hpp; priors with estimated size: Dempster et al. (1977), J. R.
/// Stat. Soc. B 39, 1-38.
FitResult fit_profile(const FitInput& input);

/// Time between knots: fine enough for floods, not finer than the profile can tell.
double choose_knot_s(double length_m, double diffusivity_m2_s, double step_s);

} // namespace rillstrand::bed

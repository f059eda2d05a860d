// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>
#include <Eigen/Sparse>

#include <random>

namespace rillstrand::column {

/// One instant of a column: means of neighbouring channels with their noise.
struct Readings {
    Eigen::ArrayXd depth_m;    ///< below the surface, increasing, all over 0
    Eigen::ArrayXd value_degC; ///< NaN where missing
    Eigen::ArrayXd sd_K;       ///< of each
    double kernel_sd_m = 0.0;  ///< vertical averaging of the fibre: sd of a Gaussian
};

/// What is known of the water's temperature on an even grid from the surface down.
struct FittedProfile {
    Eigen::ArrayXd depth_m;
    Eigen::ArrayXd mean_degC, sd_K;
    Eigen::ArrayXXd draws_degC; ///< row = depth, column = one profile that the data allow
};

/// Fits profiles to readings: a smoothing spline seen through the fibre's own averaging, whose
/// stiffness is told from the data (marginal likelihood) and follows the curvature of a first fit,
/// so that a thermocline stays sharp and mixed water smooth.
///
/// The prior is a random walk of the slope: E[(T'' dz^(1/2))^2] = t(z)^2. Readings are the mean of
/// T over a Gaussian kernel about their depth, plus independent noise.
/// Source: Wahba (1978), J. R. Stat. Soc. B 40, 364-372; Pintore et al. (2006), Biometrika 93,
/// 113-125, doi:10.1093/biomet/93.1.113.
class ProfileFitter {
public:
    /// @param bottom_m  depth of the deepest reading of any time
    /// @param draws     profiles to draw from what the data allow, for the sd of what follows
    ProfileFitter(double bottom_m, int draws);
    double step_m() const { return m_step_m; }
    /// @throws nothing for missing readings; fewer than three give NaN throughout
    FittedProfile fit(const Readings& readings, std::mt19937_64& random) const;

private:
    double m_step_m;
    Eigen::Index m_nodes;
    int m_draws;
};

} // namespace rillstrand::column

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <vector>

namespace rillstrand::stream {

/// Turns a profile whose background is an integrated random walk, seen with independent noise,
/// into independent residuals of unit variance (innovations of a Kalman filter).
///
/// Background: d(level) = slope dx, d(slope) = roughness dW(x); level and slope are free at the
/// start. Whatever linear thing is added to the profile is added, whitened, to the residuals: least
/// squares on them is generalised least squares on the profile.
/// Source: Harvey (1989), Forecasting, Structural Time Series Models and the Kalman Filter,
/// section 3.4 (from memory).
class Whitener {
public:
    /// @param place_m   increasing, size n
    /// @param variance  of the independent noise at each place
    /// @param roughness2  variance of the slope's change per metre
    Whitener(const Eigen::ArrayXd& place_m, const Eigen::ArrayXd& variance, double roughness2);

    Eigen::Index size() const { return m_gap.size(); }
    /// Sum of log innovation variances.
    double log_det() const { return m_log_det; }
    /// Whitened profile.
    Eigen::VectorXd apply(const Eigen::Ref<const Eigen::ArrayXd>& profile) const;
    /// The same for a profile that is 0 before `first`: only [first, first + out.size()) is given.
    void apply_from(Eigen::Index first, const Eigen::Ref<const Eigen::ArrayXd>& profile,
                    Eigen::Ref<Eigen::VectorXd> out) const;

private:
    Eigen::ArrayXd m_gap, m_gain_level, m_gain_slope, m_inverse_sd;
    double m_log_det = 0.0;
};

/// The fixed part of a profile's variance and what is to be found.
struct Roughness {
    double nugget2 = 0.0; ///< independent variance beyond the instrument's, per channel
    double roughness2 = 0.0;
};

/// A least-squares fit of columns to a profile over such a background.
struct ColumnFit {
    Eigen::VectorXd value;
    Eigen::MatrixXd covariance; ///< scaled up by `excess`
    double rss = 0.0;           ///< of whitened residuals
    double excess = 1.0;        ///< residual variance over the model's, never under 1
    Eigen::VectorXd residual;   ///< whitened
};
ColumnFit fit_columns(const Whitener& whitener, const Eigen::ArrayXd& profile,
                      const Eigen::MatrixXd& columns);

/// Nugget and roughness that make a profile with columns most likely, with heavy tails (Student,
/// 6 degrees of freedom) so that what is not in the columns yet does little harm. The
/// roughness is never so small that the background would be held stiff over more than
/// `stiff_m`.
/// @param start  where to begin the search, or none
Roughness estimate_roughness(const Eigen::ArrayXd& place_m, const Eigen::ArrayXd& profile,
                             const Eigen::ArrayXd& white_variance, const Eigen::MatrixXd& columns,
                             double stiff_m, const Roughness* start = nullptr);

} // namespace rillstrand::stream

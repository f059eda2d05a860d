// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "column/column.hpp"

namespace rillstrand::column {

/// Period of the strongest oscillation of a series on even times, hours: Hann-windowed periodogram
/// after a linear trend is taken out, against the spectrum of a first-order autoregression with the
/// same variance and lag-one correlation. NaN where the peak does not rise over eight times that
/// (the chance of one such peak among fifty frequencies of red noise is under 2 %), or where under
/// six in ten values are there.
/// Source: Torrence and Compo (1998), Bull. Am. Meteorol. Soc. 79, 61-78, for the red noise.
double peak_period_h(const Eigen::ArrayXd& time_s, const Eigen::ArrayXd& values);

/// First times of at least a day of mixed water after at least two days of stratification.
std::vector<double> overturns(const std::vector<ColumnState>& series, double bin_s);

/// Vertical diffusivity by the flux-gradient method, at depths where the water below warms by
/// conduction from above alone: K = -(d/dt int_z^bottom T A dz) / (A dT/dz).
///
/// Means over the span; sd from the scatter of the heat below about its straight line, of which one
/// value a day counts. Depths whose gradient is under 0.05 K/m, or whose water does not warm by
/// more than its sd, have none.
/// @param temperature_degC  row = time, column = depth
/// Source: Jassby and Powell (1975), Limnol. Oceanogr. 20, 530-543, doi:10.4319/lo.1975.20.4.0530.
std::vector<Diffusivity> flux_gradient(const Eigen::ArrayXd& time_s, const Eigen::ArrayXd& depth_m,
                                       const Eigen::ArrayXXd& temperature_degC,
                                       const Hypsograph& lake, double from_depth_m);

} // namespace rillstrand::column

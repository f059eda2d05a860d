// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

namespace rillstrand::bed {

/// The daily wave of one series in one window.
///
/// y = mean + trend t + A cos(omega (t - t_peak)) + second harmonic; weighted alike, missing
/// samples left out.
struct Harmonic {
    double mean = 0.0, trend_per_d = 0.0;
    double amplitude = 0.0, amplitude_sd = 0.0;
    double phase_rad = 0.0, phase_sd_rad = 0.0; ///< omega t_peak from midnight UTC, 0 to 2 pi
    double second_amplitude = 0.0;              ///< 12 h
    double second_phase_rad = 0.0;
    double residual = 0.0; ///< root mean square
    Eigen::Index n = 0;
};

/// Fits rows [first, first + count). With residuals that are alike from sample to sample (r1 their
/// correlation), n samples stand for n (1 - r1) / (1 + r1).
/// @return amplitude NaN where samples do not cover three quarters of the window's length or of the
/// day's hours, or are fewer than eight
Harmonic fit_harmonic(const Eigen::Ref<const Eigen::ArrayXd>& time_s,
                      const Eigen::Ref<const Eigen::ArrayXd>& values);

} // namespace rillstrand::bed

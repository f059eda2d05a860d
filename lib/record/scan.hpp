// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/progress.hpp"
#include "record/source.hpp"

namespace rillstrand::record {

/// Statistics of every channel over all times. Arrays have size n_place; NaN where a channel has
/// too few samples for the statistic.
struct ScanSummary {
    Eigen::ArrayXd n; ///< samples that are not missing
    Eigen::ArrayXd mean_degC, sd_degC, min_degC, max_degC;
    /// Quantiles with linear interpolation between order statistics; exact to 0.005 K, on data of
    /// whole hundredths exact.
    Eigen::ArrayXd p05_degC, p50_degC, p95_degC;
    /// Mean over UTC days of the day's maximum minus minimum, K; days with under three quarters of
    /// the usual number of samples are left out.
    Eigen::ArrayXd daily_range_K;
    /// Amplitudes (half the swing) of the 24 h and 12 h waves, by least squares together with mean
    /// and linear trend; NaN for records under one day.
    Eigen::ArrayXd diurnal_amplitude_K, diurnal_amplitude_sd_K, semidiurnal_amplitude_K;
    /// Hour of the day, UTC, at which the 24 h wave peaks, [0, 24).
    Eigen::ArrayXd diurnal_phase_h;
    Eigen::ArrayXd trend_Kd; ///< of the same fit, K per day
    /// White noise of one sample, from second differences in time: median(|x1 - 2 x2 + x3|) /
    /// (0.6745 sqrt 6), so that smooth change and rare jumps do not count. For 1000 independent
    /// Gaussian samples its own error is about 4 %.
    Eigen::ArrayXd noise_K;
};

struct ScanOptions {
    Eigen::Index tile_columns = 256; ///< channels of one task
    Eigen::Index tile_rows = 0;      ///< rows read at a time; 0: the source's own blocks
};

/// One pass over the temperatures of a record. A task is a tile of channels over all time; its sums
/// run in order of time, so results are the same for any number of threads and any tile.
ScanSummary scan(const Source& source, const ScanOptions& options, Progress& progress);

} // namespace rillstrand::record

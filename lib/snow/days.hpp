// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <string>
#include <vector>

namespace rillstrand::snow {

/// What each day of each channel looked like. Arrays have row = day, column = channel; NaN where
/// the day holds too few samples (under a quarter of a day).
struct Days {
    double offset_s = 0.0;         ///< local time minus UTC; a day begins at local midnight
    std::vector<std::string> date; ///< `YYYY-MM-DD` of local time; consecutive, gaps included
    Eigen::ArrayXd first_s;        ///< UTC of each day's begin
    double bins_a_day = 0.0;

    Eigen::ArrayXXd samples; ///< bins that hold a temperature, 0 included
    Eigen::ArrayXXd mean_degC, min_degC, max_degC;
    Eigen::ArrayXXd swing_K;     ///< 5 % to 95 % range, times 1/0.9, cleared of noise
    Eigen::ArrayXXd swing_sd_K;  ///< of swing_K, from noise and number of samples
    Eigen::ArrayXXd harmonic_K;  ///< twice the amplitude of the 24 h wave, by least squares
    Eigen::ArrayXXd near_zero_h; ///< hours within 0.25 K plus two sd of noise of 0 degC
    /// The calmer half of the day (0-12 h or 12-24 h local time): snow that covers more than half
    /// of a day leaves one half calm, whatever happened in the other.
    Eigen::ArrayXXd calm_swing_K; ///< 2 sqrt 2 times its standard deviation, cleared of noise
    Eigen::ArrayXXd calm_mean_degC, calm_max_degC;
    Eigen::ArrayXd noise_K; ///< sd of one bin, size n_channel

    Eigen::Index n_day() const { return first_s.size(); }
};

/// Local mean solar time from the longitude: 240 s a degree.
double solar_offset_s(double longitude_deg);

/// @param time_s  UTC, middles of equal bins, increasing; bins may be missing
/// @param temperature_degC  row = bin, column = channel
/// A pure daily sine of range R has calm_swing near R and, over whole days, a standard deviation
/// of R / (2 sqrt 2), which is why a swing is 2 sqrt 2 standard deviations.
Days make_days(const Eigen::ArrayXd& time_s, double bin_s,
               const Eigen::Ref<const Eigen::ArrayXXf>& temperature_degC, double offset_s,
               double zero_offset_K = 0.0);

} // namespace rillstrand::snow

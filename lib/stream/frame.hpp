// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/stream.hpp"

namespace rillstrand::stream {

/// The part of a reach that can be used, in the order of the water, without holes.
struct Frame {
    Eigen::ArrayXd time_s;
    double interval_s = 0.0;
    Eigen::ArrayXd place_m; ///< fibre metres from the upstream end of the reach, increasing
    Eigen::ArrayXd fibre_m; ///< of each channel: increasing or decreasing
    std::vector<Eigen::Index> channel; ///< index in StreamInput
    Eigen::ArrayXXd water_degC;        ///< row = time, column = channel; no NaN
    Eigen::ArrayXd mean_degC;          ///< median along the reach at each time
    Eigen::ArrayXd white_K;            ///< white noise of one value, per channel
    double correlated = 1.0;    ///< variance of a sum of neighbours over that of independent ones
    double jitter_K = 0.0;      ///< fast wandering common to all channels, rms
    double response_sd_m = 0.0; ///< Gaussian that stands for the spatial response
    double sign = 1.0;          ///< fibre = origin + sign * place
    double origin_m = 0.0;
    std::vector<Exclusion> dropped; ///< channels set aside here, with reasons
    Eigen::Index filled = 0;        ///< single values filled from neighbours

    double fibre_at(double place) const { return origin_m + sign * place; }
    Eigen::Index n_time() const { return water_degC.rows(); }
    Eigen::Index n_place() const { return water_degC.cols(); }
    double spacing_m() const;
};

/// Sorts out channels and times: excluded stretches, channels that are mostly missing, frozen or
/// far noisier than the rest, times when most channels are missing; fills single holes from
/// neighbours; measures noise.
///
/// White noise per channel: from second differences in time of each channel against the mean
/// of two others beyond the spatial response, so that what the water does drops out (scaled
/// median absolute deviation, smoothed along the fibre).
/// @throws DataError if too little is left or sizes disagree
Frame make_frame(const StreamInput& input);

/// A series at the times of a frame: linear between its points, constant beyond by one hour at
/// most, else NaN.
Eigen::ArrayXd at_times(const Series& series, const Eigen::ArrayXd& time_s);

/// Median of the finite values; NaN if there are none.
double median(std::vector<double> values);

} // namespace rillstrand::stream

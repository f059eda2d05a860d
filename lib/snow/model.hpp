// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "snow/days.hpp"

#include <Eigen/Core>

namespace rillstrand::snow {

/// What the hidden Markov model is told beside the days.
struct ModelInput {
    Eigen::ArrayXd fibre_m;
    double burial_depth_m = 0.0;
    double spatial_response_m = 1.0;
    double zero_offset_K = 0.0;   ///< what the record reads at 0 degC, from baths
    Eigen::ArrayXd air_mean_degC; ///< a value a day, NaN where unknown; empty: no air
    Eigen::ArrayXd air_swing_K;   ///< same
    /// Nats in favour of snow during the first rounds: where the record allows two coherent
    /// answers, the start decides between them.
    double lean = 0.0;
    double message_channels = 1.0; ///< channels' worth of evidence that others give of the forcing
};

/// What the model found.
struct ModelResult {
    Eigen::ArrayXXd
        probability;          ///< of snow on more than half of the day; row = day, column = channel
    Eigen::ArrayXd forcing_K; ///< swing that bare, open ground would have shown that day
    Eigen::ArrayXd forcing_log_sd; ///< of its logarithm
    Eigen::ArrayXd forcing_known; ///< 0: nothing but habit says so, 1: bare channels or air show it
    Eigen::ArrayXd bare_share;    ///< per channel: its swing when bare over the forcing
    Eigen::ArrayXd snow_share;    ///< per channel: its swing under snow over the forcing
    Eigen::ArrayXd under_snow_degC; ///< per channel: where its temperature stands under snow
};

/// Snow or bare by a hidden Markov chain a channel that also carries the level of the day's forcing
/// (how much swing bare ground would have shown), which all channels share.
///
/// A day's evidence is its calm swing against forcing times the channel's own share, the change of
/// its mean against that of bare channels or air, and how far it rises over what ground under snow
/// can reach. On an overcast day forcing is low, both states expect the same, and the chain alone
/// carries the state across.
ModelResult run_model(const Days& days, const ModelInput& input);

} // namespace rillstrand::snow

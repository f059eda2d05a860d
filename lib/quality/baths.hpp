// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"
#include "record/source.hpp"

#include <string>

/// Can a record be trusted: what reference baths, noise and events say about it.
namespace rillstrand::quality {

/// What an independent probe says about one bath.
struct BathReference {
    Eigen::ArrayXd temperature_degC; ///< size n_time of the record; NaN where not known
    double sd_K = 0.0;               ///< of the reference itself, the same error at all times
};

/// A bath of constant temperature.
BathReference constant_reference(Eigen::Index n_time, double temperature_degC, double sd_K);

/// How the record stands against one bath. Missing (NaN) where the bath has no usable samples.
struct BathResult {
    std::string name;
    campaign::BathUse use = campaign::BathUse::validate;
    double from_m = 0.0, to_m = 0.0; ///< of the channels that were used
    Eigen::Index channels = 0;
    Eigen::Index samples = 0;
    double bias_c = 0.0;    ///< mean of record minus reference, K
    double bias_sd_c = 0.0; ///< from the scatter between channels and of the reference
    double rmse_c = 0.0;    ///< root of the mean square of record minus reference, all samples
    double drift_kd = 0.0;  ///< slope in time of record minus reference, K per day
    double drift_sd_kd = 0.0;
    double gradient_km = 0.0; ///< slope along the fibre inside the bath, K per metre
    double gradient_sd_km = 0.0;
    /// False where the ends of the bath differ by more than 0.05 K and by more than three sd: the
    /// bath was not stirred, or its ends lie outside (common practice, no source).
    bool stirred = true;
};

/// Channels of a bath that its edges do not touch: 1.5 times the spatial response, and at least one
/// channel, is left out at each end where three channels or more remain.
record::PlaceRange inner_places(const record::Axes& axes, double from_m, double to_m,
                                double response_m);

/// Compares a record with one bath over all times.
/// @param reference  size n_time; times without a reference are left out
/// @param response_m spatial response (10-90 %), m: nearer samples are not independent
/// @throws DataError if no channel of the record lies in the bath
BathResult assess_bath(const record::Source& source, const campaign::Bath& bath,
                       const BathReference& reference, double response_m);

} // namespace rillstrand::quality

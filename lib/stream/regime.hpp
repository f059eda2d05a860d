// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/stream.hpp"

namespace rillstrand::stream {

/// Greatest seven-day mean of daily maxima of one channel.
///
/// A day counts if it has nine tenths of its bins; seven consecutive days must count, else there is
/// no value. Days run from local solar midnight.
/// Source: U.S. EPA (2003), EPA 910-B-03-002 (the mean; agencies differ on the day it is assigned
/// to, which the greatest does not need).
/// @param solar_offset_s  solar time minus UTC
/// @return degC; NaN under seven full days in a row
double seven_day_maximum_degC(const Eigen::ArrayXd& time_s, double interval_s,
                              const Eigen::Ref<const Eigen::ArrayXd>& temperature_degC,
                              double solar_offset_s);

/// Every seven-day mean of consecutive values; a window with a missing day has none (NaN).
Eigen::ArrayXd seven_day_means(const Eigen::ArrayXd& daily);

/// Hours above (not at) a threshold.
double hours_above(const Eigen::Ref<const Eigen::ArrayXd>& temperature_degC, double threshold_degC,
                   double interval_s);

/// Contiguous channels that are colder than the reach's median of the same time by a given amount,
/// on average over the afternoons (11 to 19 h solar).
std::vector<Refuge> find_refuges(const StreamInput& input, const Eigen::ArrayXd& usable,
                                 double colder_by_K, double solar_offset_s);

} // namespace rillstrand::stream

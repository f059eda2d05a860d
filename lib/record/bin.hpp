// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/progress.hpp"
#include "record/source.hpp"

namespace rillstrand::record {

/// Temperatures of neighbouring channels averaged over equal bins of time.
struct BinnedRecord {
    Eigen::ArrayXd time_s;     ///< UTC, middles of the bins that hold any sample, increasing
    double bin_s = 0.0;        ///< length of a bin
    Eigen::ArrayXd distance_m; ///< fibre distance
    Eigen::ArrayXXf mean_degC; ///< row = bin, column = place; NaN where no sample
    Eigen::ArrayXXf count;     ///< samples in each mean
};

/// Averages a range of channels over bins that start at whole multiples of bin_s since 1970.
/// A bin holds the samples whose middle lies in it.
BinnedRecord bin(const Source& source, PlaceRange range, double bin_s, Progress& progress);

/// A bin length: at least so long, a whole number of averaging intervals, dividing a day, and long
/// enough that means and counts stay under max_bytes.
double choose_bin_s(const Axes& axes, Eigen::Index n_place, double at_least_s, double max_bytes);

/// All traces of a range of channels, row = time, column = place.
Eigen::ArrayXXf read_all(const Source& source, PlaceRange range, Quantity quantity);

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "campaign/campaign.hpp"

#include <Eigen/Core>

namespace rillstrand::record {

/// A logger's series beside the record, sorted by time, without missing values.
struct SideValues {
    Eigen::ArrayXd time_s; ///< UTC seconds since 1970-01-01
    Eigen::ArrayXd value;
    Warnings warnings;
};

/// Reads one column of a delimited file with a `time` column. Stamps are ISO 8601 or in the
/// record's time_format; without an offset they are in the record's zone. The record's
/// clock_offset_s is not applied, it is the instrument's; its words and numbers for 'missing' hold
/// here too.
/// @throws DataError naming file, line or column
SideValues read_side_series(const campaign::SideSeries& series, const campaign::Record& record);

/// Means of a series over averaging intervals.
///
/// A logger that samples more often than the interval is averaged over it; one that samples more
/// rarely is interpolated to the interval's ends and middle, but not across more than
/// largest_gap_s.
/// @param time_s    middles of the intervals, size n
/// @param interval_s  their length, 0: values at the instants
/// @return size n; the value at the interval's middle where the series does not cover the whole of
///         it; NaN where it does not cover that either, or pauses longer than largest_gap_s
Eigen::ArrayXd mean_over_intervals(const SideValues& series, const Eigen::ArrayXd& time_s,
                                   double interval_s, double largest_gap_s);

/// A gap that interpolation may bridge: three times the series' usual spacing, at least one hour
/// (common practice, no source).
double usual_gap_s(const SideValues& series);

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/gather.hpp"

namespace rillstrand::record {

/// One trace as it came from a file.
struct Trace {
    double time_s = 0.0; ///< UTC as stamped
    std::string origin;  ///< `file` or `file:line`, for messages
    std::vector<Eigen::ArrayXf> rows;
};

/// How many traces of one time with different values may be averaged.
inline constexpr std::size_t most_copies = 1000;

/// The averaging interval: said, or the median spacing of the stamps.
double tell_interval(const campaign::Record& record, std::vector<double> sorted_times_s,
                     GatherReport& report);

/// Takes traces in order of time, deals with traces of one time as the campaign says, notes gaps,
/// and hands rows on with their time moved to the middle of the interval. Of traces with the same
/// values one is kept; the mean is taken over those that differ, each value over the traces that
/// have it.
class RowOrder {
public:
    RowOrder(const campaign::Record& record, GatherReport& report, Sink& sink);
    /// @throws DataError if two traces of one time differ and the campaign refuses that
    void take(Trace trace);
    /// Hands on the last trace and closes the report.
    void finish();

private:
    void hand_on();
    void take_mean();
    const campaign::Record& m_record;
    GatherReport& m_report;
    Sink& m_sink;
    Trace m_held;
    bool m_holding = false;
    std::vector<Trace> m_others; ///< of the same time with other values, for their mean
    double m_last_s = 0.0;
    Eigen::Index m_channels = 0;
};

/// Brings a row to another axis: `nearest` within half a spacing of its own, `linear` between two
/// neighbours that both have a value; NaN elsewhere.
Eigen::ArrayXf on_axis(const Eigen::ArrayXd& from_m, const Eigen::ArrayXf& row,
                       const Eigen::ArrayXd& to_m, campaign::Align align);

/// @throws DataError naming both axes and the first place where they differ, unless `align` says
/// how
void check_axes(const Eigen::ArrayXd& first, const std::string& first_file,
                const Eigen::ArrayXd& other, const std::string& other_file, campaign::Align align);

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/progress.hpp"
#include "record/scan.hpp"
#include "record/source.hpp"

#include <string>
#include <vector>

namespace rillstrand::quality {

/// Something in the record that is no temperature of the ground or the water, or may not be.
struct Event {
    std::string kind;    ///< one word, see find_events
    double from_m = 0.0; ///< NaN, both, where the whole trace is meant
    double to_m = 0.0;
    double from_s = 0.0; ///< UTC; NaN, both, where the whole record is meant
    double to_s = 0.0;
    double size_K = 0.0; ///< NaN where it has none
    std::string evidence;
    std::string done; ///< what became of it
};

/// What events are told from, apart from the record.
struct EventInput {
    const record::Source& source;
    const record::ScanSummary& scan;
    /// Setting of each channel (`streambed`, `bath`, ...) and its stretch; size n_place.
    const std::vector<std::string>& setting;
    const std::vector<std::string>& stretch;
    double spatial_response_m = 1.0;
};

/// Finds, in this order:
/// `dead`     channels without any sample;
/// `stuck`    channels that hold one value throughout, at least 10 samples;
/// `noisy`    white noise over five times the usual one and over 0.2 K;
/// `exposed`  streambed channels whose day swing exceeds their neighbours' (median of 50 on each
///            side) by 30 %, 0.3 K and six robust sd: out of the water or in the sun;
/// `splice`   a step in a streambed stretch that stays the same while the water warms and cools.
///            An inflow's step, f (T_in - T), follows the water with slope -f; what would need a
///            contrast over 15 K to explain is called constant;
/// `clock`    a step in time that is no whole number of intervals in a record that else keeps them;
/// `dropout`  traces that miss over half of the living channels;
/// `jump`     nine in ten channels change at once by one amount, and stay;
/// `trace`    the same for one trace, which is off as a whole;
/// `spike`    one sample twelve sd off those before and after, its neighbours along the fibre not.
/// Thresholds: common practice, no source; false alarms are counted by the room's tests.
/// Memory is bounded: up to 64 channels are read over all times, the rest as means of time bins.
std::vector<Event> find_events(const EventInput& input, Progress& progress);

} // namespace rillstrand::quality

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "quality/events.hpp"

#include <algorithm>
#include <limits>

namespace rillstrand::quality::parts {

constexpr double missing = std::numeric_limits<double>::quiet_NaN();

/// Median without NaN; NaN if nothing is left.
double median(std::vector<double> values);
/// 1.4826 times the median distance from the median.
double robust_sd(const std::vector<double>& values);

/// Events told from statistics of channels.
void channel_events(const EventInput& input, std::vector<Event>& events);
/// Steps along streambed stretches that do not follow the water.
void splice_events(const EventInput& input, Progress& progress, std::vector<Event>& events);
/// Events of whole traces and of the clock.
void trace_events(const EventInput& input, Progress& progress, std::vector<Event>& events);
/// Single samples.
void spike_events(const EventInput& input, Progress& progress, std::vector<Event>& events);

} // namespace rillstrand::quality::parts

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/discharge.hpp"
#include "stream/frame.hpp"
#include "stream/stream.hpp"

#include <cstddef>
#include <vector>

namespace rillstrand::stream {

/// Makes one gaining stretch of steps that only together tell a ramp.
///
/// Water that comes in all along a stretch is fitted by several small steps in a row, none of which
/// has a place of its own: three or more in the direction of the water, each at most 30 m from the
/// next, each known to no better than 0.4 m, none with more than six tenths of the whole. A true
/// step of the same size is placed to a tenth of a metre, so these limits part the two (chosen
/// here, by that argument). Shares join as ln(1 - f) adds; errors of neighbours are taken as
/// independent.
///
/// @param gains  one for each inflow with a share
/// @param owner  index of the inflow of each gain; all three are rewritten together
void join_chains(const Frame& frame, std::vector<Inflow>& inflows, std::vector<Gain>& gains,
                 std::vector<std::size_t>& owner);

} // namespace rillstrand::stream

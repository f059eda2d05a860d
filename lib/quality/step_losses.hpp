// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "quality/adjust.hpp"

namespace rillstrand::quality {

/// Finds losses that are constant in time: places outside the baths where the time mean of
/// ln(P_s / P_as) jumps by more than its surroundings and its noise explain, and where the jump is
/// the same at all hours of the day although the water's temperature is not.
///
/// A jump is the step in a straight line through the channels within five spatial responses (at
/// least six channels) on either side, those within one response left out.
/// @param warnings  gets the jumps of which it cannot be told whether they are losses
std::vector<StepLoss> find_step_losses(const record::Source& source,
                                       const std::vector<AdjustBath>& baths, double response_m,
                                       Warnings& warnings);

} // namespace rillstrand::quality

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/assemble.hpp"

namespace rillstrand::stream {

/// A stretch where water comes in all along.
struct DiffuseGain {
    double from_m = 0.0, to_m = 0.0; ///< place
    double value = 0.0, sd = 0.0;    ///< -ln(1 - f) over the stretch
    double score = 0.0;
};

/// Looks for stretches whose slope follows the contrast Tin - T beyond what sun, air and lag
/// explain (see diffuse.cpp).
std::vector<DiffuseGain> find_diffuse(const Context& context);

} // namespace rillstrand::stream

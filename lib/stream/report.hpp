// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/solve.hpp"
#include "stream/stream.hpp"

namespace rillstrand::stream {

/// One paragraph on what was done, with citations.
std::string method_text(const Frame& frame, const Solution& solution,
                        const StreamFindings& findings);

/// What is most worth a visit: 0..1 from size, contrast with its error and doubt.
void rank(std::vector<Inflow>& inflows);

} // namespace rillstrand::stream

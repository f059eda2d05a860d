// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/source.hpp"

namespace rillstrand::stream {

/// All that was worked out of one reach.
struct Context {
    const StreamInput& input;
    const Frame& frame;
    const Patterns& patterns;
    std::optional<Eigen::ArrayXd> inflow_degC; ///< given, or shared by the reach; none: unknown
    double inflow_sd_K = 0.0;
    Solution solution;
    std::vector<Judged> judged;
    SourceTemperature source;
};

/// Turns pieces and verdicts into findings: inflows, artefacts, channels, discharge, refuges.
void assemble(const Context& context, StreamFindings& findings);

} // namespace rillstrand::stream

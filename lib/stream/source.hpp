// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/judge.hpp"

namespace rillstrand::stream {

/// Temperature of what comes in, told from the record.
struct SourceTemperature {
    bool found = false;
    double degC = 0.0, sd_K = 0.0;      ///< shared by the reach
    double chi2 = 0.0;                  ///< of the inflows' own temperatures about it
    int count = 0;                      ///< inflows it stands on
    Eigen::VectorXd own_degC, own_sd_K; ///< of each piece; NaN where it has none
    std::vector<std::size_t> apart;     ///< pieces whose own temperature does not agree
};

/// An inflow's share f is known from how it damps the swings; the mean step is f (Tin - Tu): from
/// both, Tin of each inflow, and the weighted mean of those that agree (chi-square test at
/// 1 %, the worst left out one by one).
///
/// @param shares  a solution whose weighting shuts constants out, so that it needs no Tin
SourceTemperature source_temperature(const Frame& frame, const Patterns& patterns,
                                     const Solution& shares, const std::vector<Judged>& judged);

} // namespace rillstrand::stream

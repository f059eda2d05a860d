// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstdint>
#include <vector>

namespace rillstrand::record {

/// Counts of values by hundredths of a kelvin; grows with the range of the values.
class HundredthCounts {
public:
    void add(float value);
    std::int64_t total() const { return m_total; }
    /// Quantile with linear interpolation between order statistics.
    /// Source: Hyndman and Fan (1996), Am. Stat. 50, 361-365, definition 7.
    double quantile(double p) const;
    /// Median of values that are spread evenly inside their hundredth: finer than a hundredth.
    double spread_median() const;

private:
    void grow(std::int64_t bin);
    double order_statistic(std::int64_t rank) const;
    std::vector<std::uint32_t> m_counts;
    std::int64_t m_origin = 0; ///< bin of m_counts[0]
    std::int64_t m_total = 0;
};

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/counts.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::record {

namespace {
constexpr float bins_per_K = 100.0F;
constexpr double bin_K = 0.01;
constexpr std::int64_t margin = 256;
} // namespace

void HundredthCounts::add(float value) {
    const auto bin = static_cast<std::int64_t>(std::lrint(value * bins_per_K));
    const std::int64_t at = bin - m_origin;
    if (at < 0 || at >= static_cast<std::int64_t>(m_counts.size()))
        grow(bin);
    ++m_counts[static_cast<std::size_t>(bin - m_origin)];
    ++m_total;
}

void HundredthCounts::grow(std::int64_t bin) {
    if (m_counts.empty()) {
        m_origin = bin - margin;
        m_counts.assign(2 * margin, 0);
        return;
    }
    const std::int64_t end = m_origin + static_cast<std::int64_t>(m_counts.size());
    const std::int64_t new_origin = std::min(m_origin, bin - margin);
    const std::int64_t new_end = std::max(end, bin + margin);
    std::vector<std::uint32_t> counts(static_cast<std::size_t>(new_end - new_origin), 0);
    std::copy(m_counts.begin(), m_counts.end(),
              counts.begin() + static_cast<std::ptrdiff_t>(m_origin - new_origin));
    m_counts = std::move(counts);
    m_origin = new_origin;
}

double HundredthCounts::order_statistic(std::int64_t rank) const {
    std::int64_t below = 0;
    for (std::size_t k = 0; k < m_counts.size(); ++k) {
        below += m_counts[k];
        if (below > rank)
            return static_cast<double>(m_origin + static_cast<std::int64_t>(k)) * bin_K;
    }
    return std::numeric_limits<double>::quiet_NaN();
}

double HundredthCounts::quantile(double p) const {
    if (m_total == 0)
        return std::numeric_limits<double>::quiet_NaN();
    const double position = p * static_cast<double>(m_total - 1);
    const auto rank = static_cast<std::int64_t>(std::floor(position));
    const double low = order_statistic(rank);
    const double rest = position - static_cast<double>(rank);
    return rest == 0.0 ? low : low + rest * (order_statistic(rank + 1) - low);
}

double HundredthCounts::spread_median() const {
    if (m_total == 0)
        return std::numeric_limits<double>::quiet_NaN();
    const double half = 0.5 * static_cast<double>(m_total);
    double below = 0.0;
    for (std::size_t k = 0; k < m_counts.size(); ++k) {
        const double here = m_counts[k];
        if (below + here >= half && here > 0.0) {
            const auto bin = static_cast<double>(m_origin + static_cast<std::int64_t>(k));
            // Sizes are not negative: the bin of zero reaches from 0 to half a hundredth.
            const double from = std::max(0.0, bin - 0.5), to = bin + 0.5;
            return (from + (to - from) * (half - below) / here) * bin_K;
        }
        below += here;
    }
    return std::numeric_limits<double>::quiet_NaN();
}

} // namespace rillstrand::record

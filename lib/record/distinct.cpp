// SPDX-License-Identifier: Apache-2.0
#include "record/distinct.hpp"

#include <algorithm>

namespace rillstrand::record {

namespace {
constexpr std::size_t most_pending = 4096;
}

void Distinct::add(double value) {
    if (m_expected < m_sorted.size() && m_sorted[m_expected] == value) {
        ++m_expected;
        return;
    }
    if (m_sorted.empty() || value > m_sorted.back()) {
        m_sorted.push_back(value);
        m_expected = m_sorted.size();
        return;
    }
    const auto found = std::lower_bound(m_sorted.begin(), m_sorted.end(), value);
    if (*found == value) {
        m_expected = static_cast<std::size_t>(found - m_sorted.begin()) + 1;
        return;
    }
    m_pending.insert(value);
    if (m_pending.size() >= most_pending)
        merge();
}

void Distinct::merge() {
    std::vector<double> all;
    all.reserve(size());
    std::merge(m_sorted.begin(), m_sorted.end(), m_pending.begin(), m_pending.end(),
               std::back_inserter(all));
    // A number that was pending may have come again as the largest, hence in both.
    all.erase(std::unique(all.begin(), all.end()), all.end());
    m_sorted = std::move(all);
    m_pending.clear();
    m_expected = 0;
}

std::vector<double> Distinct::take() {
    merge();
    return std::move(m_sorted);
}

std::size_t PlaceFinder::find(double value) {
    const auto& list = *m_sorted;
    if (m_last + 1 < list.size() && list[m_last + 1] == value)
        return ++m_last;
    if (list[m_last] == value)
        return m_last;
    if (m_last > 0 && list[m_last - 1] == value)
        return --m_last;
    m_last = list.front() == value
                 ? 0
                 : static_cast<std::size_t>(std::lower_bound(list.begin(), list.end(), value) -
                                            list.begin());
    return m_last;
}

} // namespace rillstrand::record

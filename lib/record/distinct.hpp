// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstddef>
#include <set>
#include <vector>

namespace rillstrand::record {

/// The different numbers of a long sequence. Quick where they come in rising order, again and
/// again, or each many times in a row.
class Distinct {
public:
    void add(double value);
    /// How many there are so far, at least.
    std::size_t size() const { return m_sorted.size() + m_pending.size(); }
    /// All of them in rising order.
    std::vector<double> take();

private:
    void merge();
    std::vector<double> m_sorted;
    std::set<double> m_pending; ///< not yet in m_sorted
    std::size_t m_expected = 0; ///< index of the number that will come next, if all is as usual
};

/// Positions in a sorted list of different numbers, quick where they are asked for in order.
class PlaceFinder {
public:
    explicit PlaceFinder(const std::vector<double>& sorted) : m_sorted{&sorted} {}
    /// @param value  one of the list
    std::size_t find(double value);

private:
    const std::vector<double>* m_sorted;
    std::size_t m_last = 0;
};

} // namespace rillstrand::record

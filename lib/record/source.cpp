// SPDX-License-Identifier: Apache-2.0
#include "record/source.hpp"

#include <algorithm>
#include <cassert>

namespace rillstrand::record {

PlaceRange places_between(const Axes& axes, double from_m, double to_m) {
    constexpr double tolerance_m = 1e-3;
    const double* begin = axes.distance_m.data();
    const double* end = begin + axes.distance_m.size();
    const double* first = std::lower_bound(begin, end, from_m - tolerance_m);
    const double* last = std::upper_bound(first, end, to_m + tolerance_m);
    return {first - begin, last - first};
}

MemorySource::MemorySource(Axes axes, Eigen::ArrayXXf temperature_degC) : m_axes{std::move(axes)} {
    add(Quantity::temperature, std::move(temperature_degC));
}

void MemorySource::add(Quantity quantity, Eigen::ArrayXXf values) {
    assert(values.rows() == m_axes.n_time() && values.cols() == m_axes.n_place());
    m_values.emplace_back(quantity, std::move(values));
}

bool MemorySource::has(Quantity quantity) const {
    return std::any_of(m_values.begin(), m_values.end(),
                       [quantity](const auto& value) { return value.first == quantity; });
}

void MemorySource::read(Quantity quantity, Eigen::Index i_time, Eigen::Index j_place,
                        Eigen::Ref<Eigen::ArrayXXf> out) const {
    const auto found =
        std::find_if(m_values.begin(), m_values.end(),
                     [quantity](const auto& value) { return value.first == quantity; });
    assert(found != m_values.end());
    out = found->second.block(i_time, j_place, out.rows(), out.cols());
}

} // namespace rillstrand::record

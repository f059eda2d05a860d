// SPDX-License-Identifier: Apache-2.0
#include "column/hypsograph.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "record/delimited.hpp"

#include <algorithm>
#include <vector>

namespace rillstrand::column {

Hypsograph::Hypsograph(Eigen::ArrayXd depth_m, Eigen::ArrayXd area_m2)
    : m_depth_m{std::move(depth_m)}, m_area_m2{std::move(area_m2)} {}

Hypsograph Hypsograph::constant(double depth_m) {
    return {Eigen::ArrayXd{{0.0, depth_m}}, Eigen::ArrayXd{{1.0, 1.0}}};
}

double Hypsograph::area_m2(double depth_m) const {
    if (depth_m <= 0.0)
        return m_area_m2(0);
    if (depth_m > bottom_m())
        return 0.0;
    const double* begin = m_depth_m.data();
    const auto next = std::lower_bound(begin, begin + m_depth_m.size(), depth_m) - begin;
    const auto k = std::clamp<Eigen::Index>(next, 1, m_depth_m.size() - 1);
    const double w = (depth_m - m_depth_m(k - 1)) / (m_depth_m(k) - m_depth_m(k - 1));
    return (1.0 - w) * m_area_m2(k - 1) + w * m_area_m2(k);
}

Hypsograph read_hypsograph(const std::filesystem::path& file) {
    const record::Delimited table = record::read_delimited(file);
    const auto depth = table.column("depth_m"), area = table.column("area_m2");
    if (!depth || !area)
        throw DataError{file.string() + ":1: a hypsograph needs the columns depth_m and area_m2"};
    std::vector<double> depths, areas;
    for (std::size_t i = 0; i < table.rows.size(); ++i) {
        const auto d = table.number(i, *depth), a = table.number(i, *area);
        if (!d || !a)
            throw DataError{table.place(i) + ": depth or area is missing; fill it in or take the "
                                             "row out"};
        if (depths.empty() && *d != 0.0)
            throw DataError{table.place(i) + ": the first depth is " + text::number(*d) +
                            " m; begin with the area of the surface at depth 0"};
        if (!depths.empty() && *d <= depths.back())
            throw DataError{table.place(i) + ": depth " + text::number(*d) + " m comes after " +
                            text::number(depths.back()) + " m; sort the rows by depth"};
        if (*a < 0.0 || (areas.empty() && *a <= 0.0) || (!areas.empty() && *a > areas.back()))
            throw DataError{table.place(i) + ": area " + text::number(*a) +
                            " m2 does not lie between 0 and the area above it; correct it"};
        depths.push_back(*d);
        areas.push_back(*a);
    }
    if (depths.size() < 2)
        throw DataError{file.string() + ": a hypsograph needs at least two depths"};
    const auto n = static_cast<Eigen::Index>(depths.size());
    return {Eigen::Map<const Eigen::ArrayXd>(depths.data(), n),
            Eigen::Map<const Eigen::ArrayXd>(areas.data(), n)};
}

} // namespace rillstrand::column

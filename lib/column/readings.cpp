// SPDX-License-Identifier: Apache-2.0
#include "column/readings.hpp"

#include "record/winding.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::column {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double finest_m = 0.05; // nothing finer matters at a scale of half a metre
constexpr double most_groups = 250.0;
constexpr double usual_noise_K = 0.05; // where too few traces tell it
constexpr double least_noise_K = 0.004;

double median(std::vector<double> values) {
    if (values.empty())
        return nan;
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    return *middle;
}

/// White noise of a series from its second differences, whose slow part is little.
double noise_K(const Eigen::ArrayXd& series) {
    std::vector<double> size;
    for (Eigen::Index i = 1; i + 1 < series.size(); ++i) {
        const double bend = series(i - 1) - 2.0 * series(i) + series(i + 1);
        if (!std::isnan(bend))
            size.push_back(std::abs(bend));
    }
    return size.size() < 10 ? nan : median(size) / (0.6745 * std::sqrt(6.0));
}

/// Share of a Gaussian kernel that reaches above the surface.
double share_in_air(double depth_m, double kernel_m) {
    return 0.5 * std::erfc(depth_m / (kernel_m * std::sqrt(2.0)));
}

} // namespace

Eigen::ArrayXd depths_below_datum_m(const Eigen::ArrayXd& fibre_m, const campaign::Column& config) {
    return fibre_m.unaryExpr([&](double f) {
        return record::depth_below_datum_m(f, config.datum_fibre_m, config.direction,
                                           config.winding);
    });
}

ReadingMaker::ReadingMaker(const ColumnInput& input)
    : m_input{input}, m_kernel_m{input.spatial_response_m / 2.563103 *
                                 record::height_per_fibre(input.config.winding)} {
    const Eigen::ArrayXd below_m = depths_below_datum_m(input.fibre_m, input.config);
    const Eigen::Index n = below_m.size();
    const double span_m = n > 1 ? std::abs(below_m(n - 1) - below_m(0)) : 0.0;
    const double wanted_m = std::max(finest_m, span_m / most_groups);
    std::vector<double> centre;
    for (Eigen::Index first = 0; first < n;) {
        Eigen::Index end = first + 1;
        while (end < n && std::abs(below_m(end) - below_m(first)) < wanted_m * (1.0 - 1e-9))
            ++end;
        m_groups.push_back({first, end - first});
        centre.push_back(below_m.segment(first, end - first).mean());
        first = end;
    }
    if (centre.size() > 1 && centre.back() < centre.front()) {
        std::reverse(m_groups.begin(), m_groups.end());
        std::reverse(centre.begin(), centre.end());
    }
    const auto groups = static_cast<Eigen::Index>(centre.size());
    m_below_m = Eigen::Map<const Eigen::ArrayXd>(centre.data(), groups);
    m_noise_K.resize(groups);
    std::vector<double> known;
    for (Eigen::Index g = 0; g < groups; ++g) {
        const Group& group = m_groups[static_cast<std::size_t>(g)];
        const auto block = input.single_degC.middleCols(group.first, group.count).cast<double>();
        m_noise_K(g) = noise_K(block.rowwise().mean());
        if (!std::isnan(m_noise_K(g)))
            known.push_back(m_noise_K(g));
    }
    const double middle = known.empty() ? usual_noise_K : median(known);
    // One group's own figure is rough; it is pulled half way to the middle one.
    for (double& noise : m_noise_K)
        noise = std::max(least_noise_K, std::isnan(noise) ? middle : std::sqrt(noise * middle));
}

double ReadingMaker::depth_m(Eigen::Index group, Eigen::Index i_time) const {
    if (m_input.level_m.size() == 0)
        return m_below_m(group);
    return m_input.level_m(i_time) - (*m_input.config.datum_elevation_m - m_below_m(group));
}

double ReadingMaker::deepest_m() const {
    const Eigen::Index last = m_below_m.size() - 1;
    if (m_input.level_m.size() == 0)
        return m_below_m(last);
    double deepest = -std::numeric_limits<double>::infinity();
    for (Eigen::Index i = 0; i < m_input.level_m.size(); ++i)
        if (!std::isnan(m_input.level_m(i)))
            deepest = std::max(deepest, depth_m(last, i));
    return deepest;
}

double ReadingMaker::mean_degC(const Group& group, Eigen::Index i_time, double& traces) const {
    double sum = 0.0, n = 0.0;
    traces = 0.0;
    for (Eigen::Index j = group.first; j < group.first + group.count; ++j) {
        const auto value = static_cast<double>(m_input.temperature_degC(i_time, j));
        if (std::isnan(value))
            continue;
        sum += value;
        n += 1.0;
        traces += static_cast<double>(m_input.samples(i_time, j));
    }
    traces = n > 0.0 ? traces / n : 0.0;
    // A group with half of its channels missing no longer stands at its depth.
    return 2.0 * n >= static_cast<double>(group.count) && n > 0.0 ? sum / n : nan;
}

Readings ReadingMaker::at(Eigen::Index i_time, int& in_air) const {
    Readings out;
    out.kernel_sd_m = m_kernel_m;
    in_air = 0;
    std::vector<double> depth, value, sd, air;
    for (Eigen::Index g = 0; g < m_below_m.size(); ++g) {
        const Group& group = m_groups[static_cast<std::size_t>(g)];
        const double z = depth_m(g, i_time);
        if (std::isnan(z))
            continue;
        double traces = 0.0;
        const double t = mean_degC(group, i_time, traces);
        if (z <= 0.0) {
            in_air += static_cast<int>(group.count);
            if (z < -3.0 * m_kernel_m - 0.1 && !std::isnan(t))
                air.push_back(t);
            continue;
        }
        if (z < 1.6 * m_kernel_m)
            continue;
        depth.push_back(z);
        value.push_back(t);
        sd.push_back(m_noise_K(g) / std::sqrt(std::max(1.0, traces)));
    }
    const double air_degC = median(air);
    for (std::size_t k = 0; k < depth.size(); ++k) {
        // A box has no air in it where a Gaussian still has some: half the correction is made and
        // half of it is doubtful.
        const double share = 0.5 * share_in_air(depth[k], m_kernel_m);
        if (!std::isnan(air_degC) && share > 1e-5) {
            value[k] = (value[k] - share * air_degC) / (1.0 - share);
            sd[k] = std::hypot(sd[k], share * (air_degC - value[k]));
        }
        sd[k] = std::max(sd[k], least_noise_K);
    }
    const auto n = static_cast<Eigen::Index>(depth.size());
    out.depth_m = Eigen::Map<const Eigen::ArrayXd>(depth.data(), n);
    out.value_degC = Eigen::Map<const Eigen::ArrayXd>(value.data(), n);
    out.sd_K = Eigen::Map<const Eigen::ArrayXd>(sd.data(), n);
    return out;
}

} // namespace rillstrand::column

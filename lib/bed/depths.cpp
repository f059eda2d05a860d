// SPDX-License-Identifier: Apache-2.0
#include "bed/depths.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <vector>

namespace rillstrand::bed {

double fibre_per_height(const std::optional<campaign::Winding>& winding) {
    if (!winding)
        return 1.0;
    constexpr double pi = 3.14159265358979323846;
    return std::hypot(pi * winding->diameter_m, winding->pitch_m) / winding->pitch_m;
}

Eigen::ArrayXd depths_m(const campaign::Bed& config, const Eigen::ArrayXd& fibre_m) {
    const double sign = config.direction == campaign::Direction::down ? 1.0 : -1.0;
    return sign * (fibre_m - config.datum_fibre_m) / fibre_per_height(config.winding);
}

double white_noise_K(const Eigen::ArrayXd& time_s, const Eigen::ArrayXd& values, double step_s) {
    std::vector<double> sizes;
    for (Eigen::Index i = 3; i < values.size(); ++i) {
        if (time_s(i) - time_s(i - 3) > 3.01 * step_s)
            continue;
        const double d = values(i) - 3.0 * values(i - 1) + 3.0 * values(i - 2) - values(i - 3);
        if (std::isfinite(d))
            sizes.push_back(std::abs(d));
    }
    if (sizes.size() < 8)
        return std::numeric_limits<double>::quiet_NaN();
    const auto middle = sizes.begin() + static_cast<std::ptrdiff_t>(sizes.size() / 2);
    std::nth_element(sizes.begin(), middle, sizes.end());
    // The median of a normal variable's size is 0.6745 sd; coefficients 1, 3, 3, 1.
    return *middle / 0.6745 / std::sqrt(20.0);
}

Eigen::ArrayXXd smoothed_in_time(const Eigen::ArrayXd& time_s, const Eigen::ArrayXXd& values,
                                 double sigma_s) {
    using Eigen::Index;
    const double reach_s = 2.5 * sigma_s;
    const Index n = time_s.size();
    double step_s = reach_s;
    for (Index i = 1; i < n; ++i)
        step_s = std::min(step_s, time_s(i) - time_s(i - 1));
    double whole = 0.0;
    const auto reach = static_cast<Index>(reach_s / step_s + 1e-6);
    for (Index k = -reach; k <= reach; ++k)
        whole += std::exp(-0.5 * std::pow(static_cast<double>(k) * step_s / sigma_s, 2));
    Eigen::ArrayXXd result =
        Eigen::ArrayXXd::Constant(n, values.cols(), std::numeric_limits<double>::quiet_NaN());
    Index low = 0, high = 0;
    for (Index i = 0; i < n; ++i) {
        while (time_s(low) < time_s(i) - reach_s - 1.0)
            ++low;
        while (high < n && time_s(high) <= time_s(i) + reach_s + 1.0)
            ++high;
        for (Index j = 0; j < values.cols(); ++j) {
            double w0 = 0.0, w1 = 0.0, w2 = 0.0, y0 = 0.0, y1 = 0.0;
            for (Index k = low; k < high; ++k) {
                const double y = values(k, j);
                if (std::isnan(y))
                    continue;
                const double x = (time_s(k) - time_s(i)) / sigma_s;
                const double w = std::exp(-0.5 * x * x);
                w0 += w;
                w1 += w * x;
                w2 += w * x * x;
                y0 += w * y;
                y1 += w * x * y;
            }
            if (w0 > 0.67 * whole)
                result(i, j) = (w2 * y0 - w1 * y1) / (w0 * w2 - w1 * w1);
        }
    }
    return result;
}

} // namespace rillstrand::bed

// SPDX-License-Identifier: Apache-2.0
#include "quality/legs.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::quality {

LegComparison compare_legs(const Eigen::ArrayXd& fibre_m, const Eigen::ArrayXd& ground_m,
                           const Eigen::ArrayXd& mean_degC, const std::vector<int>& leg) {
    constexpr double nan = std::numeric_limits<double>::quiet_NaN();
    constexpr double nearest_m = 2.0;              // farther apart they are not beside each other
    std::vector<std::pair<double, double>> second; // ground, temperature
    for (Eigen::Index j = 0; j < fibre_m.size(); ++j)
        if (leg[static_cast<std::size_t>(j)] == 2 && std::isfinite(ground_m(j)) &&
            std::isfinite(mean_degC(j)))
            second.emplace_back(ground_m(j), mean_degC(j));
    std::sort(second.begin(), second.end());
    std::vector<std::pair<double, double>> difference; // fibre, K
    for (Eigen::Index j = 0; j < fibre_m.size() && second.size() > 1; ++j) {
        if (leg[static_cast<std::size_t>(j)] != 1 || !std::isfinite(ground_m(j)) ||
            !std::isfinite(mean_degC(j)))
            continue;
        const auto next =
            std::lower_bound(second.begin(), second.end(), std::pair{ground_m(j), -1e300});
        if (next == second.begin() || next == second.end())
            continue;
        const auto before = next - 1;
        const double span_m = next->first - before->first;
        if (span_m > nearest_m)
            continue;
        const double w = span_m > 0.0 ? (ground_m(j) - before->first) / span_m : 0.0;
        difference.emplace_back(fibre_m(j),
                                (1.0 - w) * before->second + w * next->second - mean_degC(j));
    }
    LegComparison result;
    result.places = static_cast<Eigen::Index>(difference.size());
    if (difference.empty()) {
        result.difference_K = result.rmse_K = result.largest_K = result.largest_fibre_m = nan;
        return result;
    }
    double sum = 0.0, square = 0.0;
    for (const auto& [fibre, d] : difference) {
        sum += d;
        square += d * d;
    }
    const auto n = static_cast<double>(difference.size());
    result.difference_K = sum / n;
    result.rmse_K = std::sqrt(square / n);
    for (const auto& [fibre, d] : difference)
        if (std::abs(d - result.difference_K) >= std::abs(result.largest_K)) {
            result.largest_K = d - result.difference_K;
            result.largest_fibre_m = fibre;
        }
    return result;
}

} // namespace rillstrand::quality

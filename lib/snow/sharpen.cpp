// SPDX-License-Identifier: Apache-2.0
#include "snow/sharpen.hpp"

#include <algorithm>
#include <cmath>
#include <vector>

namespace rillstrand::snow {

namespace {

/// Channels further apart than this have nothing of each other.
double reach_m(const SnowInput& input) {
    return std::max(3.0, 1.5 * input.spatial_response_m);
}

} // namespace

double find_leak(const SnowInput& input, const Days& days, const Eigen::ArrayXXd& probability) {
    const Eigen::Index places = probability.cols();
    std::vector<Eigen::Index> first(static_cast<std::size_t>(days.n_day()) + 1,
                                    input.time_s.size());
    for (Eigen::Index i = input.time_s.size(); i-- > 0;) {
        const auto d = static_cast<std::size_t>((input.time_s(i) - days.first_s(0)) / 86400.0);
        first[d] = i;
    }
    for (std::size_t d = first.size() - 1; d-- > 0;)
        first[d] = std::min(first[d], first[d + 1]);
    std::vector<double> slopes;
    for (Eigen::Index j = 0; j < places; ++j)
        for (Eigen::Index d = 0; d < days.n_day(); ++d) {
            if (!(probability(d, j) > 0.8))
                continue;
            std::vector<Eigen::Index> bare;
            for (const Eigen::Index k : {j - 1, j + 1})
                if (k >= 0 && k < places &&
                    std::abs(input.fibre_m(k) - input.fibre_m(j)) <= reach_m(input) &&
                    probability(d, k) < 0.2 && days.calm_swing_K(d, k) > 2.0)
                    bare.push_back(k);
            if (bare.empty())
                continue;
            double n = 0.0, x = 0.0, y = 0.0, xx = 0.0, xy = 0.0;
            const auto at = static_cast<std::size_t>(d);
            for (Eigen::Index i = first[at]; i < first[at + 1]; ++i) {
                double beside = 0.0;
                for (const Eigen::Index k : bare)
                    beside += static_cast<double>(input.temperature_degC(i, k));
                const auto own = static_cast<double>(input.temperature_degC(i, j));
                if (std::isnan(beside + own))
                    continue;
                n += 1.0;
                x += beside;
                y += own;
                xx += beside * beside;
                xy += beside * own;
            }
            const double spread = xx - x * x / n;
            if (n > 5.0 && spread > 0.0)
                slopes.push_back((xy - x * y / n) / spread);
        }
    if (slopes.size() < 12)
        return 0.0;
    const auto middle = slopes.begin() + static_cast<std::ptrdiff_t>(slopes.size() / 2);
    std::nth_element(slopes.begin(), middle, slopes.end());
    return std::clamp(*middle, 0.0, 0.35);
}

Eigen::ArrayXXf sharpened(const SnowInput& input, double leak) {
    const Eigen::ArrayXXf& seen = input.temperature_degC;
    Eigen::ArrayXXf result = seen;
    const auto share = static_cast<float>(leak);
    for (Eigen::Index j = 0; j < seen.cols(); ++j) {
        for (Eigen::Index i = 0; i < seen.rows(); ++i) {
            const float own = seen(i, j);
            float beside = 0.0F;
            for (const Eigen::Index k : {j - 1, j + 1}) {
                const bool near = k >= 0 && k < seen.cols() &&
                                  std::abs(input.fibre_m(k) - input.fibre_m(j)) <= reach_m(input);
                beside += near && !std::isnan(seen(i, k)) ? seen(i, k) : own;
            }
            result(i, j) = (own - share * beside) / (1.0F - 2.0F * share);
        }
    }
    return result;
}

} // namespace rillstrand::snow

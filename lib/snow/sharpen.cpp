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
    const auto third = slopes.begin() + static_cast<std::ptrdiff_t>(slopes.size() / 3);
    std::nth_element(slopes.begin(), third, slopes.end());
    return std::clamp(*third, 0.0, 0.35);
}

Eigen::ArrayXXf sharpened(const SnowInput& input, double leak, const Days& days,
                          const Eigen::ArrayXXd& probability) {
    const Eigen::ArrayXXf& seen = input.temperature_degC;
    Eigen::ArrayXXf result = seen;
    for (Eigen::Index j = 0; j < seen.cols(); ++j)
        for (Eigen::Index i = 0; i < seen.rows(); ++i) {
            const auto d = static_cast<Eigen::Index>((input.time_s(i) - days.first_s(0)) / 86400.0);
            float let_in = 0.0F, share = 0.0F;
            for (const Eigen::Index k : {j - 1, j + 1}) {
                if (k < 0 || k >= seen.cols() || std::isnan(seen(i, k)) ||
                    std::abs(input.fibre_m(k) - input.fibre_m(j)) > reach_m(input))
                    continue;
                const auto weight = static_cast<float>(leak * (1.0 - probability(d, k)));
                let_in += weight * seen(i, k);
                share += weight;
            }
            result(i, j) = (seen(i, j) - let_in) / (1.0F - share);
        }
    return result;
}

} // namespace rillstrand::snow

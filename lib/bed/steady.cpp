// SPDX-License-Identifier: Apache-2.0
#include "bed/steady.hpp"

#include "heat/vertical_flow.hpp"

#include <Eigen/QR>

#include <cmath>
#include <limits>

namespace rillstrand::bed {

SteadyFlux steady_flux(const Eigen::ArrayXd& depth_m, const Eigen::ArrayXd& mean_degC,
                       double scatter_K, double conductivity_W_m_K, double conductivity_share) {
    using Eigen::Index;
    const Index n = depth_m.size();
    SteadyFlux result{std::numeric_limits<double>::quiet_NaN(),
                      std::numeric_limits<double>::quiet_NaN()};
    if (n < 4)
        return result;
    const double length = depth_m(n - 1) - depth_m(0);
    Eigen::MatrixXd design = Eigen::MatrixXd::Ones(n, 2);
    const auto misfit = [&](double beta) {
        for (Index i = 0; i < n; ++i)
            design(i, 1) = heat::steady_share(beta, (depth_m(i) - depth_m(0)) / length);
        const Eigen::VectorXd y = mean_degC.matrix();
        return (y - design * design.colPivHouseholderQr().solve(y)).squaredNorm();
    };
    double best = 0.0, least = std::numeric_limits<double>::infinity();
    constexpr double most = 60.0;
    for (double beta = -most; beta <= most; beta += 0.5)
        if (const double m = misfit(beta); m < least) {
            least = m;
            best = beta;
        }
    for (double step = 0.25; step > 1e-4; step *= 0.5)
        for (const double to : {best - step, best + step})
            if (const double m = misfit(to); m < least) {
                least = m;
                best = to;
            }
    const double d = std::max(0.05, 0.02 * std::abs(best));
    const double curve = (misfit(best + d) - 2.0 * least + misfit(best - d)) / (d * d);
    const double variance = std::max(scatter_K * scatter_K, least / static_cast<double>(n - 3));
    if (!(curve > 0.0) || std::abs(best) > most - 1.0)
        return result;
    const double sd = std::sqrt(2.0 * variance / curve);
    // A bend that could be anything tells no flux.
    if (sd > 10.0)
        return result;
    result.flux_m_s = heat::flux_of_beta_m_s(best, conductivity_W_m_K, length);
    result.sd_m_s = std::hypot(heat::flux_of_beta_m_s(sd, conductivity_W_m_K, length),
                               conductivity_share * result.flux_m_s);
    return result;
}

} // namespace rillstrand::bed

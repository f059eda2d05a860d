// SPDX-License-Identifier: Apache-2.0
#include "stream/background.hpp"

#include <Eigen/Cholesky>
#include <Eigen/QR>

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {
constexpr double free_level2 = 1e4;  // diffuse start: profiles are of order 1
constexpr double free_slope2 = 1e-1; // per metre, squared
constexpr double tail_dof = 6.0;
} // namespace

Whitener::Whitener(const Eigen::ArrayXd& place_m, const Eigen::ArrayXd& variance,
                   double roughness2) {
    const Eigen::Index n = place_m.size();
    m_gap = Eigen::ArrayXd::Zero(n);
    m_gain_level.resize(n);
    m_gain_slope.resize(n);
    m_inverse_sd.resize(n);
    double p00 = free_level2, p01 = 0.0, p11 = free_slope2;
    for (Eigen::Index j = 0; j < n; ++j) {
        if (j > 0) {
            const double h = m_gap[j] = place_m[j] - place_m[j - 1];
            p00 += h * (2.0 * p01 + h * p11) + roughness2 * h * h * h / 3.0;
            p01 += h * p11 + roughness2 * h * h / 2.0;
            p11 += roughness2 * h;
        }
        const double f = p00 + variance[j];
        m_gain_level[j] = p00 / f;
        m_gain_slope[j] = p01 / f;
        m_inverse_sd[j] = 1.0 / std::sqrt(f);
        if (j > 1) // the first two settle level and slope
            m_log_det += std::log(f);
        p11 -= p01 * p01 / f;
        p01 *= variance[j] / f;
        p00 *= variance[j] / f;
    }
}

void Whitener::apply_from(Eigen::Index first, const Eigen::Ref<const Eigen::ArrayXd>& profile,
                          Eigen::Ref<Eigen::VectorXd> out) const {
    double level = 0.0, slope = 0.0;
    for (Eigen::Index k = 0; k < out.size(); ++k) {
        const Eigen::Index j = first + k;
        level += m_gap[j] * slope;
        const double v = profile[k] - level;
        out[k] = v * m_inverse_sd[j];
        level += m_gain_level[j] * v;
        slope += m_gain_slope[j] * v;
    }
}

Eigen::VectorXd Whitener::apply(const Eigen::Ref<const Eigen::ArrayXd>& profile) const {
    Eigen::VectorXd out(profile.size());
    apply_from(0, profile, out);
    return out;
}

ColumnFit fit_columns(const Whitener& whitener, const Eigen::ArrayXd& profile,
                      const Eigen::MatrixXd& columns) {
    ColumnFit fit;
    const Eigen::VectorXd y = whitener.apply(profile);
    fit.residual = y;
    if (columns.cols() > 0) {
        Eigen::MatrixXd white(columns.rows(), columns.cols());
        for (Eigen::Index k = 0; k < columns.cols(); ++k)
            white.col(k) = whitener.apply(columns.col(k).array());
        const Eigen::MatrixXd normal = white.transpose() * white;
        Eigen::VectorXd scale = normal.diagonal().cwiseMax(1e-300).cwiseSqrt().cwiseInverse();
        Eigen::MatrixXd scaled = scale.asDiagonal() * normal * scale.asDiagonal();
        scaled.diagonal().array() += 1e-9;
        const Eigen::LDLT<Eigen::MatrixXd> ldlt(scaled);
        const Eigen::MatrixXd inverse =
            ldlt.solve(Eigen::MatrixXd::Identity(scaled.rows(), scaled.cols()));
        fit.covariance = scale.asDiagonal() * inverse * scale.asDiagonal();
        fit.value = fit.covariance * (white.transpose() * y);
        fit.residual = y - white * fit.value;
    }
    fit.rss = fit.residual.squaredNorm();
    const double dof = std::max(1.0, double(y.size() - columns.cols() - 2));
    fit.excess = std::max(1.0, fit.rss / dof);
    if (columns.cols() > 0)
        fit.covariance *= fit.excess;
    return fit;
}

Roughness estimate_roughness(const Eigen::ArrayXd& place_m, const Eigen::ArrayXd& profile,
                             const Eigen::ArrayXd& white_variance, const Eigen::MatrixXd& columns,
                             double stiff_m, const Roughness* start) {
    const Eigen::Index n = place_m.size();
    const double spacing = (place_m[n - 1] - place_m[0]) / double(n - 1);
    const double white = white_variance.mean();
    const auto floor2 = [&](double nugget2) {
        return (white + nugget2) * spacing / std::pow(stiff_m, 4);
    };
    // log10 of nugget over white and of roughness over its floor: a search by halving steps
    const auto cost = [&](double log_nugget, double log_rough) {
        const double nugget2 = white * std::pow(10.0, log_nugget);
        const double rough2 = floor2(nugget2) * std::pow(10.0, log_rough);
        const Whitener whitener(place_m, white_variance + nugget2, rough2);
        const ColumnFit fit = fit_columns(whitener, profile, columns);
        double sum = whitener.log_det();
        for (Eigen::Index j = 2; j < n; ++j)
            sum +=
                (tail_dof + 1.0) * std::log1p(fit.residual[j] * fit.residual[j] / (tail_dof - 2.0));
        return sum;
    };
    double nugget = -1.0, rough = 2.0;
    if (start != nullptr) {
        nugget = std::clamp(std::log10(start->nugget2 / white), -3.0, 5.0);
        rough = std::clamp(std::log10(start->roughness2 / floor2(start->nugget2)), 0.0, 9.0);
    }
    double best = cost(nugget, rough);
    for (double step = start != nullptr ? 0.8 : 1.6; step > 0.1; step *= 0.5) {
        for (int round = 0; round < 6; ++round) {
            const double before = best;
            for (const auto& [dn, dr] :
                 {std::pair{step, 0.0}, {-step, 0.0}, {0.0, step}, {0.0, -step}}) {
                const double a = std::clamp(nugget + dn, -3.0, 5.0);
                const double b = std::clamp(rough + dr, 0.0, 9.0);
                const double now = cost(a, b);
                if (now < best - 1e-9) {
                    best = now;
                    nugget = a;
                    rough = b;
                }
            }
            if (best > before - 1e-6)
                break;
        }
    }
    Roughness result;
    result.nugget2 = white * std::pow(10.0, nugget);
    result.roughness2 = floor2(result.nugget2) * std::pow(10.0, rough);
    return result;
}

} // namespace rillstrand::stream

// SPDX-License-Identifier: Apache-2.0
#include "bed/harmonics.hpp"

#include <Eigen/QR>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <vector>

namespace rillstrand::bed {

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double omega = 2.0 * pi / 86400.0;

double turn(double angle) {
    const double a = std::fmod(angle, 2.0 * pi);
    return a < 0.0 ? a + 2.0 * pi : a;
}

} // namespace

Harmonic fit_harmonic(const Eigen::Ref<const Eigen::ArrayXd>& time_s,
                      const Eigen::Ref<const Eigen::ArrayXd>& values) {
    using Eigen::Index;
    Harmonic h;
    h.amplitude = h.amplitude_sd = h.phase_rad = h.phase_sd_rad = h.mean =
        std::numeric_limits<double>::quiet_NaN();
    std::vector<Index> rows;
    std::array<bool, 8> seen{};
    for (Index i = 0; i < values.size(); ++i)
        if (!std::isnan(values(i))) {
            rows.push_back(i);
            seen[static_cast<std::size_t>(std::fmod(time_s(i), 86400.0) / 10800.0) % 8] = true;
        }
    h.n = static_cast<Index>(rows.size());
    int hours = 0;
    for (const bool s : seen)
        hours += s ? 1 : 0;
    if (h.n < 8 || hours < 6 || 4 * h.n < 3 * values.size())
        return h;
    const double middle_s = time_s.mean();
    Eigen::MatrixXd design(h.n, 6);
    Eigen::VectorXd y(h.n);
    for (Index i = 0; i < h.n; ++i) {
        const Index row = rows[static_cast<std::size_t>(i)];
        // Angles from midnight, so that large epoch seconds lose no digits.
        const double a = omega * std::fmod(time_s(row), 86400.0);
        design.row(i) << 1.0, (time_s(row) - middle_s) / 86400.0, std::cos(a), std::sin(a),
            std::cos(2.0 * a), std::sin(2.0 * a);
        y(i) = values(row);
    }
    const Eigen::VectorXd c = design.colPivHouseholderQr().solve(y);
    const Eigen::VectorXd r = y - design * c;
    h.mean = c(0);
    h.trend_per_d = c(1);
    h.amplitude = std::hypot(c(2), c(3));
    h.phase_rad = turn(std::atan2(c(3), c(2)));
    h.second_amplitude = std::hypot(c(4), c(5));
    h.second_phase_rad = turn(std::atan2(c(5), c(4)));
    const double n = static_cast<double>(h.n);
    h.residual = std::sqrt(r.squaredNorm() / n);
    const double alike =
        r.squaredNorm() > 0.0
            ? std::clamp(r.head(h.n - 1).dot(r.tail(h.n - 1)) / r.squaredNorm(), 0.0, 0.99)
            : 0.0;
    const double own = std::max(2.0, n * (1.0 - alike) / (1.0 + alike));
    h.amplitude_sd = h.residual * std::sqrt(2.0 / own * n / std::max(1.0, n - 6.0));
    h.phase_sd_rad = h.amplitude > 0.0 ? std::min(pi, h.amplitude_sd / h.amplitude) : pi;
    return h;
}

} // namespace rillstrand::bed

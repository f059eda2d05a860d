// SPDX-License-Identifier: Apache-2.0
#include "stream/discharge.hpp"

#include "base/text.hpp"

#include <Eigen/Cholesky>

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Share of a gain that lies above a place.
double passed(const Gain& gain, double place_m) {
    if (gain.to_m - gain.from_m < 1e-9)
        return place_m >= gain.from_m ? 1.0 : 0.0;
    return std::clamp((place_m - gain.from_m) / (gain.to_m - gain.from_m), 0.0, 1.0);
}

Eigen::VectorXd row_at(double place_m, const std::vector<Gain>& gains) {
    Eigen::VectorXd row(static_cast<Eigen::Index>(gains.size()) + 1);
    row[0] = 1.0;
    for (std::size_t k = 0; k < gains.size(); ++k)
        row[static_cast<Eigen::Index>(k) + 1] = passed(gains[k], place_m);
    return row;
}

} // namespace

DischargeLine discharge_line(const Eigen::ArrayXd& place_m, const std::vector<Gain>& gains,
                             const std::vector<Gauged>& gaugings) {
    DischargeLine line;
    const auto n = static_cast<Eigen::Index>(gains.size());
    line.discharge_m3s = line.sd_m3s = Eigen::ArrayXd::Constant(place_m.size(), nan);
    line.gain_m3s = line.gain_sd_m3s = Eigen::ArrayXd::Constant(n, nan);
    if (gaugings.empty())
        return line;
    line.known = true;
    Eigen::MatrixXd normal = Eigen::MatrixXd::Zero(n + 1, n + 1);
    Eigen::VectorXd right = Eigen::VectorXd::Zero(n + 1);
    for (Eigen::Index k = 0; k < n; ++k) {
        const Gain& g = gains[static_cast<std::size_t>(k)];
        const double w = 1.0 / std::max(1e-12, g.log_gain_sd * g.log_gain_sd);
        normal(k + 1, k + 1) += w;
        right[k + 1] += w * g.log_gain;
    }
    for (const Gauged& q : gaugings) {
        const Eigen::VectorXd row = row_at(q.place_m, gains);
        const double relative = std::max(1e-6, q.sd_m3s / q.discharge_m3s);
        normal += row * row.transpose() / (relative * relative);
        right += row * std::log(q.discharge_m3s) / (relative * relative);
    }
    const Eigen::MatrixXd covariance = normal.ldlt().solve(Eigen::MatrixXd::Identity(n + 1, n + 1));
    const Eigen::VectorXd state = covariance * right;
    for (Eigen::Index j = 0; j < place_m.size(); ++j) {
        const Eigen::VectorXd row = row_at(place_m[j], gains);
        line.discharge_m3s[j] = std::exp(row.dot(state));
        line.sd_m3s[j] = line.discharge_m3s[j] * std::sqrt(row.dot(covariance * row));
    }
    for (Eigen::Index k = 0; k < n; ++k) {
        const Gain& g = gains[static_cast<std::size_t>(k)];
        // ln Q at the gain's lower end, the gain itself included
        Eigen::VectorXd below = row_at(g.to_m, gains);
        below[k + 1] = 1.0;
        const double q = std::exp(below.dot(state));
        const double share = 1.0 - std::exp(-state[k + 1]);
        Eigen::VectorXd slope = below * (q * share);
        slope[k + 1] += q * (1.0 - share);
        line.gain_m3s[k] = q * share;
        line.gain_sd_m3s[k] = std::sqrt(slope.dot(covariance * slope));
    }
    return line;
}

std::vector<Closure> closures(const std::vector<Gain>& gains, std::vector<Gauged> gaugings) {
    std::sort(gaugings.begin(), gaugings.end(),
              [](const Gauged& a, const Gauged& b) { return a.place_m < b.place_m; });
    std::vector<Closure> out;
    for (std::size_t i = 0; i + 1 < gaugings.size(); ++i) {
        const Gauged &a = gaugings[i], &b = gaugings[i + 1];
        Closure c;
        c.from_m = a.place_m;
        c.to_m = b.place_m;
        c.gauged_gain_m3s = b.discharge_m3s - a.discharge_m3s;
        c.gauged_gain_sd_m3s = std::hypot(a.sd_m3s, b.sd_m3s);
        double sum = 0.0, variance = 0.0;
        for (const Gain& g : gains) {
            const double part = passed(g, b.place_m) - passed(g, a.place_m);
            sum += part * g.log_gain;
            variance += part * part * g.log_gain_sd * g.log_gain_sd;
        }
        c.found_gain_m3s = a.discharge_m3s * std::expm1(sum);
        c.found_gain_sd_m3s = std::hypot(a.sd_m3s * std::expm1(sum),
                                         a.discharge_m3s * std::exp(sum) * std::sqrt(variance));
        // the upper gauging's error is in both; it enters once, through Qb - Qa exp(sum)
        const double gap = b.discharge_m3s - a.discharge_m3s * std::exp(sum);
        const double gap_sd = std::hypot(b.sd_m3s, a.sd_m3s * std::exp(sum),
                                         a.discharge_m3s * std::exp(sum) * std::sqrt(variance));
        const std::string numbers = "gauged gain " + text::fixed(1e3 * c.gauged_gain_m3s, 1) +
                                    " +- " + text::fixed(1e3 * c.gauged_gain_sd_m3s, 1) +
                                    " L/s, found by temperature " +
                                    text::fixed(1e3 * c.found_gain_m3s, 1) + " +- " +
                                    text::fixed(1e3 * c.found_gain_sd_m3s, 1) + " L/s: ";
        if (std::abs(gap) <= 2.0 * gap_sd)
            c.text = numbers + "they agree within their errors.";
        else if (gap < 0.0)
            c.text = numbers + "water is lost between the gaugings, which temperature cannot see.";
        else
            c.text = numbers + "more comes in than temperature found; inflow near the stream's own "
                               "temperature or spread over a long piece cannot be seen.";
        out.push_back(std::move(c));
    }
    return out;
}

} // namespace rillstrand::stream

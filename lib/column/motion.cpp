// SPDX-License-Identifier: Apache-2.0
#include "column/motion.hpp"

#include <algorithm>
#include <cmath>
#include <complex>
#include <limits>
#include <numbers>

namespace rillstrand::column {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Straight line by least squares.
struct Line {
    double mean_x, mean_y, slope, rest_variance, spread_x;
};

Line fit_line(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y) {
    Line line{x.mean(), y.mean(), 0.0, 0.0, 0.0};
    const Eigen::ArrayXd dx = x - line.mean_x;
    line.spread_x = dx.square().sum();
    line.slope = line.spread_x > 0.0 ? (dx * (y - line.mean_y)).sum() / line.spread_x : 0.0;
    const auto n = static_cast<double>(x.size());
    line.rest_variance =
        n > 2.0 ? (y - line.mean_y - line.slope * dx).square().sum() / (n - 2.0) : 0.0;
    return line;
}

/// Values with their gaps bridged; empty where too many are missing.
Eigen::ArrayXd bridged(const Eigen::ArrayXd& values) {
    const Eigen::Index n = values.size(), known = (!values.isNaN()).count();
    if (n < 30 || 10 * known < 6 * n)
        return {};
    Eigen::ArrayXd out = values;
    Eigen::Index last = -1;
    for (Eigen::Index i = 0; i <= n; ++i) {
        if (i < n && std::isnan(values(i)))
            continue;
        for (Eigen::Index k = last + 1; k < i; ++k) {
            const double w = static_cast<double>(k - last) / static_cast<double>(i - last);
            const double a = last >= 0 ? values(last) : values(i);
            const double b = i < n ? values(i) : a;
            out(k) = (1.0 - w) * a + w * b;
        }
        last = i;
    }
    return out;
}

/// Means of so many neighbours each.
Eigen::ArrayXd averaged(const Eigen::ArrayXd& values, Eigen::Index each) {
    if (each <= 1)
        return values;
    Eigen::ArrayXd out(values.size() / each);
    for (Eigen::Index i = 0; i < out.size(); ++i)
        out(i) = values.segment(i * each, each).mean();
    return out;
}

} // namespace

double peak_period_h(const Eigen::ArrayXd& time_s, const Eigen::ArrayXd& values) {
    constexpr Eigen::Index most = 4000;
    const Eigen::Index each = (values.size() + most - 1) / most;
    Eigen::ArrayXd x = averaged(bridged(values), each);
    if (x.size() == 0)
        return nan;
    const Eigen::Index n = x.size();
    const double step_s = static_cast<double>(each) * (time_s(time_s.size() - 1) - time_s(0)) /
                          static_cast<double>(time_s.size() - 1);
    const Eigen::ArrayXd number = Eigen::ArrayXd::LinSpaced(n, 0.0, static_cast<double>(n - 1));
    const Line line = fit_line(number, x);
    x -= line.mean_y + line.slope * (number - line.mean_x);
    const double variance = x.square().mean();
    if (!(variance > 0.0))
        return nan;
    const double lag_one = (x.head(n - 1) * x.tail(n - 1)).mean() / variance;
    const double a = std::clamp(lag_one, 0.0, 0.98);
    double window_power = 0.0;
    Eigen::ArrayXd windowed = x;
    for (Eigen::Index i = 0; i < n; ++i) {
        const double w =
            0.5 - 0.5 * std::cos(2.0 * std::numbers::pi * (static_cast<double>(i) + 0.5) /
                                 static_cast<double>(n));
        windowed(i) *= w;
        window_power += w * w;
    }
    double best_ratio = 0.0, best_frequency = 0.0;
    // From three waves in the record to a quarter of the sampling rate.
    for (Eigen::Index k = 3; k <= n / 4; ++k) {
        const double turn =
            2.0 * std::numbers::pi * static_cast<double>(k) / static_cast<double>(n);
        std::complex<double> sum;
        for (Eigen::Index i = 0; i < n; ++i)
            sum += windowed(i) * std::polar(1.0, -turn * static_cast<double>(i));
        const double power = std::norm(sum) / window_power;
        const double red = variance * (1.0 - a * a) / (1.0 + a * a - 2.0 * a * std::cos(turn));
        if (power / red > best_ratio) {
            best_ratio = power / red;
            best_frequency = static_cast<double>(k) / (static_cast<double>(n) * step_s);
        }
    }
    return best_ratio > 8.0 ? 1.0 / best_frequency / 3600.0 : nan;
}

std::vector<double> overturns(const std::vector<ColumnState>& series, double bin_s) {
    const auto enough = [&](double days) { return days * 86400.0 / bin_s; };
    std::vector<double> found;
    double stratified = 0.0, mixed = 0.0;
    bool was_stratified = false;
    for (const ColumnState& state : series) {
        if (state.stratification == "stratified" || state.stratification == "inverse") {
            mixed = 0.0;
            stratified += 1.0;
            was_stratified = was_stratified || stratified >= enough(2.0);
        } else if (state.stratification == "mixed") {
            stratified = 0.0;
            mixed += 1.0;
            if (was_stratified && mixed >= enough(1.0)) {
                found.push_back(state.time_s - (mixed - 1.0) * bin_s);
                was_stratified = false;
            }
        }
    }
    return found;
}

std::vector<Diffusivity> flux_gradient(const Eigen::ArrayXd& time_s, const Eigen::ArrayXd& depth_m,
                                       const Eigen::ArrayXXd& temperature_degC,
                                       const Hypsograph& lake, double from_depth_m) {
    std::vector<Diffusivity> found;
    const Eigen::Index n = time_s.size(), m = depth_m.size();
    const double span_s = n > 1 ? time_s(n - 1) - time_s(0) : 0.0;
    if (n < 20 || m < 5 || span_s < 5.0 * 86400.0)
        return found;
    Eigen::ArrayXd area(m);
    for (Eigen::Index k = 0; k < m; ++k)
        area(k) = lake.area_m2(std::min(depth_m(k), lake.bottom_m()));
    Eigen::ArrayXd below = Eigen::ArrayXd::Zero(n);
    for (Eigen::Index k = m - 2; k >= 1; --k) {
        const double step_m = depth_m(k + 1) - depth_m(k);
        below += 0.5 * step_m *
                 (temperature_degC.col(k) * area(k) + temperature_degC.col(k + 1) * area(k + 1));
        if (depth_m(k) < from_depth_m || !below.isFinite().all())
            continue;
        const double gradient = ((temperature_degC.col(k + 1) - temperature_degC.col(k - 1)) /
                                 (depth_m(k + 1) - depth_m(k - 1)))
                                    .mean();
        const Line line = fit_line(time_s, below);
        const double days = std::max(3.0, span_s / 86400.0);
        const double slope_sd =
            std::sqrt(line.rest_variance / line.spread_x * static_cast<double>(n) / days);
        if (gradient > -0.05 || line.slope < slope_sd || !(area(k) > 0.0))
            continue;
        const double per = -1.0 / (area(k) * gradient);
        found.push_back({time_s(0), time_s(n - 1), depth_m(k), line.slope * per, slope_sd * per});
    }
    std::reverse(found.begin(), found.end());
    return found;
}

} // namespace rillstrand::column

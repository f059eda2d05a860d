// SPDX-License-Identifier: Apache-2.0
#include "stats/lines.hpp"

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/normal.hpp>

#include <algorithm>
#include <cassert>
#include <cmath>
#include <limits>
#include <vector>

namespace rillstrand::stats {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

struct Sums {
    double mx, my, sxx, syy, sxy;
};

Sums sums_of(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y) {
    assert(x.size() == y.size() && x.size() > 1);
    const double mx = x.mean(), my = y.mean();
    return {mx, my, (x - mx).square().sum(), (y - my).square().sum(), ((x - mx) * (y - my)).sum()};
}

Line through_middle(const Sums& s, double slope) {
    return {s.my - slope * s.mx, slope, nan, nan};
}

double median(std::vector<double> values) {
    std::sort(values.begin(), values.end());
    const std::size_t n = values.size();
    return n % 2 == 1 ? values[n / 2] : 0.5 * (values[n / 2 - 1] + values[n / 2]);
}

std::vector<double> as_vector(const Eigen::ArrayXd& values) {
    return {values.data(), values.data() + values.size()};
}

} // namespace

Line least_squares(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y) {
    const Sums s = sums_of(x, y);
    Line line = through_middle(s, s.sxy / s.sxx);
    const auto n = static_cast<double>(x.size());
    const double rest = std::max(0.0, s.syy - line.slope * s.sxy) / (n - 2.0);
    line.slope_sd = std::sqrt(rest / s.sxx);
    line.intercept_sd = std::sqrt(rest * (1.0 / n + s.mx * s.mx / s.sxx));
    return line;
}

Line inverse_least_squares(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y) {
    const Sums s = sums_of(x, y);
    return through_middle(s, s.syy / s.sxy);
}

Line weighted_least_squares(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y,
                            const Eigen::ArrayXd& weight) {
    const double total = weight.sum();
    const double mx = (weight * x).sum() / total, my = (weight * y).sum() / total;
    const double sxx = (weight * (x - mx).square()).sum();
    const double slope = (weight * (x - mx) * (y - my)).sum() / sxx;
    return {my - slope * mx, slope, std::sqrt(1.0 / total + mx * mx / sxx), std::sqrt(1.0 / sxx)};
}

Line deming(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y, double delta) {
    const Sums s = sums_of(x, y);
    const double d = s.syy - delta * s.sxx;
    return through_middle(s, (d + std::sqrt(d * d + 4.0 * delta * s.sxy * s.sxy)) / (2.0 * s.sxy));
}

Line reduced_major_axis(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y) {
    const Sums s = sums_of(x, y);
    return through_middle(s, std::copysign(std::sqrt(s.syy / s.sxx), s.sxy));
}

TheilSen theil_sen(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y, double level) {
    std::vector<double> slopes;
    for (Eigen::Index i = 0; i < x.size(); ++i)
        for (Eigen::Index j = 0; j < i; ++j)
            if (x(i) != x(j))
                slopes.push_back((y(i) - y(j)) / (x(i) - x(j)));
    std::sort(slopes.begin(), slopes.end());
    TheilSen result;
    result.slope = median(slopes);
    result.intercept = median(as_vector(y)) - result.slope * median(as_vector(x));
    const auto n = static_cast<double>(x.size());
    const boost::math::normal normal;
    const double z = boost::math::quantile(normal, 0.5 + 0.5 * level);
    const double spread = z * std::sqrt(n * (n - 1.0) * (2.0 * n + 5.0) / 18.0);
    const auto count = static_cast<double>(slopes.size());
    const auto low = static_cast<std::ptrdiff_t>(std::round(0.5 * (count - spread)));
    const auto high = static_cast<std::ptrdiff_t>(std::round(0.5 * (count + spread)));
    const auto last = static_cast<std::ptrdiff_t>(slopes.size()) - 1;
    result.slope_low =
        slopes[static_cast<std::size_t>(std::clamp<std::ptrdiff_t>(low - 1, 0, last))];
    result.slope_high = slopes[static_cast<std::size_t>(std::clamp<std::ptrdiff_t>(high, 0, last))];
    return result;
}

YorkLine york(const Eigen::ArrayXd& x, const Eigen::ArrayXd& weight_x, const Eigen::ArrayXd& y,
              const Eigen::ArrayXd& weight_y, const Eigen::ArrayXd& correlation) {
    const Eigen::ArrayXd r =
        correlation.size() > 0 ? correlation : Eigen::ArrayXd::Zero(x.size()).eval();
    const Eigen::ArrayXd alpha = (weight_x * weight_y).sqrt();
    YorkLine result;
    double b = least_squares(x, y).slope, mx = 0.0, my = 0.0;
    Eigen::ArrayXd w, beta;
    for (result.iterations = 1; result.iterations <= 200; ++result.iterations) {
        w = weight_x * weight_y / (weight_x + b * b * weight_y - 2.0 * b * r * alpha);
        mx = (w * x).sum() / w.sum();
        my = (w * y).sum() / w.sum();
        const Eigen::ArrayXd u = x - mx, v = y - my;
        beta = w * (u / weight_y + b * v / weight_x - (b * u + v) * r / alpha);
        const double next = (w * beta * v).sum() / (w * beta * u).sum();
        const bool settled = std::abs(next - b) <= 1e-15 * (1.0 + std::abs(next));
        b = next;
        if (settled)
            break;
    }
    const Eigen::ArrayXd adjusted = mx + beta;
    const double adjusted_mean = (w * adjusted).sum() / w.sum();
    result.line.slope = b;
    result.line.intercept = my - b * mx;
    const double slope_variance = 1.0 / (w * (adjusted - adjusted_mean).square()).sum();
    result.line.slope_sd = std::sqrt(slope_variance);
    result.line.intercept_sd =
        std::sqrt(1.0 / w.sum() + adjusted_mean * adjusted_mean * slope_variance);
    result.covariance = -adjusted_mean * slope_variance;
    result.chi_square = (w * (y - result.line.intercept - b * x).square()).sum();
    const boost::math::chi_squared chi{static_cast<double>(x.size() - 2)};
    result.probability = boost::math::cdf(boost::math::complement(chi, result.chi_square));
    return result;
}

} // namespace rillstrand::stats

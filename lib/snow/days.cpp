// SPDX-License-Identifier: Apache-2.0
#include "snow/days.hpp"

#include "base/text.hpp"

#include <Eigen/Dense>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numbers>

namespace rillstrand::snow {

namespace {

constexpr double day_s = 86400.0;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Samples of one channel and one day.
struct Piece {
    std::vector<double> hour, value;
};

double quantile(std::vector<double>& values, double share) {
    const double at = share * static_cast<double>(values.size() - 1);
    const auto low = static_cast<std::ptrdiff_t>(at);
    std::nth_element(values.begin(), values.begin() + low, values.end());
    const double first = values[static_cast<std::size_t>(low)];
    if (at <= static_cast<double>(low))
        return first;
    const double second = *std::min_element(values.begin() + low + 1, values.end());
    return first + (at - static_cast<double>(low)) * (second - first);
}

/// Noise of one bin: second differences on the quietest fifth of the days, where the ground's own
/// curvature is least.
double noise_of(const std::vector<Piece>& days) {
    std::vector<double> daily;
    for (const Piece& day : days) {
        if (day.value.size() < 8)
            continue;
        double sum = 0.0;
        for (std::size_t i = 1; i + 1 < day.value.size(); ++i) {
            const double second = day.value[i - 1] - 2.0 * day.value[i] + day.value[i + 1];
            sum += second * second;
        }
        daily.push_back(std::sqrt(sum / (6.0 * static_cast<double>(day.value.size() - 2))));
    }
    return daily.empty() ? 0.0 : quantile(daily, 0.2);
}

struct Moments {
    double n = 0.0, mean = nan, variance = nan, highest = nan;
};

Moments moments(const Piece& day, double from_h, double to_h) {
    Moments m;
    double sum = 0.0, sum2 = 0.0;
    std::vector<double> values;
    for (std::size_t i = 0; i < day.value.size(); ++i)
        if (day.hour[i] >= from_h && day.hour[i] < to_h)
            values.push_back(day.value[i]);
    m.n = static_cast<double>(values.size());
    if (values.empty())
        return m;
    for (const double v : values)
        sum += v;
    m.mean = sum / m.n;
    for (const double v : values)
        sum2 += (v - m.mean) * (v - m.mean);
    m.variance = m.n > 1.0 ? sum2 / (m.n - 1.0) : 0.0;
    m.highest = quantile(values, 0.9);
    return m;
}

double harmonic_K(const Piece& day) {
    const auto n = static_cast<Eigen::Index>(day.value.size());
    Eigen::MatrixXd basis(n, 3);
    Eigen::VectorXd right(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        const double angle = day.hour[static_cast<std::size_t>(i)] * 2.0 * std::numbers::pi / 24.0;
        basis.row(i) << 1.0, std::cos(angle), std::sin(angle);
        right(i) = day.value[static_cast<std::size_t>(i)];
    }
    const Eigen::Matrix3d normal = basis.transpose() * basis;
    const Eigen::Vector3d x = normal.ldlt().solve(basis.transpose() * right);
    return 2.0 * std::hypot(x(1), x(2));
}

void fill_day(Days& days, Eigen::Index d, Eigen::Index j, const Piece& day, double bin_h,
              double zero_K) {
    const auto n = static_cast<double>(day.value.size());
    days.samples(d, j) = n;
    if (n < std::max(3.0, 0.25 * days.bins_a_day))
        return;
    const double noise = days.noise_K(j);
    double sum = 0.0, near = 0.0;
    for (const double v : day.value) {
        sum += v;
        near += std::abs(v - zero_K) <= 0.25 + 2.0 * noise ? bin_h : 0.0;
    }
    days.mean_degC(d, j) = sum / n;
    const auto [low, high] = std::minmax_element(day.value.begin(), day.value.end());
    days.min_degC(d, j) = *low;
    days.max_degC(d, j) = *high;
    days.near_zero_h(d, j) = near;
    std::vector<double> sorted = day.value;
    // White noise widens the 5 to 95 % range of n samples by 2 times 1.645 sd, in quadrature.
    const double raw = (quantile(sorted, 0.95) - quantile(sorted, 0.05)) / 0.9;
    const double by_noise = std::min(3.29, 1.2 * std::sqrt(n)) * noise / 0.9;
    days.swing_K(d, j) = std::sqrt(std::max(0.0, raw * raw - by_noise * by_noise));
    days.swing_sd_K(d, j) = 2.1 * noise * std::sqrt(2.0 * std::max(1.0, 24.0 / n));
    if (n >= 0.6 * days.bins_a_day)
        days.harmonic_K(d, j) = harmonic_K(day);

    Moments calm;
    for (const double from_h : {0.0, 12.0}) {
        const Moments half = moments(day, from_h, from_h + 12.0);
        if (half.n >= std::max(2.0, 0.2 * days.bins_a_day) &&
            !(calm.variance <= half.variance)) // NaN: none yet
            calm = half;
    }
    if (std::isnan(calm.variance))
        return;
    days.calm_swing_K(d, j) = std::sqrt(8.0 * std::max(0.0, calm.variance - noise * noise));
    days.calm_mean_degC(d, j) = calm.mean;
    days.calm_max_degC(d, j) = calm.highest;
}

} // namespace

double solar_offset_s(double longitude_deg) {
    return 240.0 * longitude_deg;
}

Days make_days(const Eigen::ArrayXd& time_s, double bin_s,
               const Eigen::Ref<const Eigen::ArrayXXf>& temperature_degC, double offset_s,
               double zero_offset_K) {
    Days days;
    days.offset_s = offset_s;
    days.bins_a_day = day_s / bin_s;
    const Eigen::Index n_place = temperature_degC.cols();
    days.noise_K = Eigen::ArrayXd::Zero(n_place);
    if (time_s.size() == 0)
        return days;
    const double first_day = std::floor((time_s(0) + offset_s) / day_s);
    const double last_day = std::floor((time_s(time_s.size() - 1) + offset_s) / day_s);
    const auto n_day = static_cast<Eigen::Index>(last_day - first_day) + 1;
    days.first_s =
        (first_day + Eigen::ArrayXd::LinSpaced(n_day, 0.0, static_cast<double>(n_day - 1))) *
            day_s -
        offset_s;
    for (Eigen::Index d = 0; d < n_day; ++d)
        days.date.push_back(
            text::iso_time((first_day + static_cast<double>(d)) * day_s).substr(0, 10));
    for (Eigen::ArrayXXd* field : {&days.mean_degC, &days.min_degC, &days.max_degC, &days.swing_K,
                                   &days.swing_sd_K, &days.harmonic_K, &days.near_zero_h,
                                   &days.calm_swing_K, &days.calm_mean_degC, &days.calm_max_degC})
        field->setConstant(n_day, n_place, nan);
    days.samples.setZero(n_day, n_place);
    std::vector<Piece> pieces(static_cast<std::size_t>(n_day));
    for (Eigen::Index j = 0; j < n_place; ++j) {
        for (Piece& piece : pieces) {
            piece.hour.clear();
            piece.value.clear();
        }
        for (Eigen::Index i = 0; i < time_s.size(); ++i) {
            const auto value = static_cast<double>(temperature_degC(i, j));
            if (std::isnan(value))
                continue;
            const double local_s = time_s(i) + offset_s - first_day * day_s;
            const auto d = static_cast<std::size_t>(local_s / day_s);
            pieces[d].hour.push_back((local_s - static_cast<double>(d) * day_s) / 3600.0);
            pieces[d].value.push_back(value);
        }
        days.noise_K(j) = noise_of(pieces);
        for (Eigen::Index d = 0; d < n_day; ++d)
            fill_day(days, d, j, pieces[static_cast<std::size_t>(d)], bin_s / 3600.0,
                     zero_offset_K);
    }
    return days;
}

} // namespace rillstrand::snow

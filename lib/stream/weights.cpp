// SPDX-License-Identifier: Apache-2.0
#include "stream/weights.hpp"

#include <Eigen/Cholesky>

#include <algorithm>
#include <cmath>
#include <numbers>

namespace rillstrand::stream {

namespace {

using Mask = Eigen::Array<bool, Eigen::Dynamic, 1>;

Eigen::ArrayXd rate_of_change(const Eigen::ArrayXd& time_s, const Eigen::ArrayXd& value) {
    const Eigen::Index n = value.size();
    Eigen::ArrayXd rate(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        Eigen::Index a = i, b = i; // about an hour either side
        while (a > 0 && time_s[i] - time_s[a] < 2400.0)
            --a;
        while (b + 1 < n && time_s[b] - time_s[i] < 2400.0)
            ++b;
        rate[i] = b > a ? (value[b] - value[a]) / (time_s[b] - time_s[a]) : 0.0;
    }
    return rate;
}

/// Median over the reach of slopes between groups of channels 40 m apart: steps are few and
/// do not reach the median.
Eigen::ArrayXd usual_gradient(const Frame& frame) {
    const Eigen::Index n = frame.n_place();
    const auto half = std::clamp<Eigen::Index>(static_cast<Eigen::Index>(20.0 / frame.spacing_m()),
                                               1, std::max<Eigen::Index>(1, n / 6));
    Eigen::ArrayXd gradient(frame.n_time());
    std::vector<double> slopes;
    for (Eigen::Index i = 0; i < frame.n_time(); ++i) {
        slopes.clear();
        const auto row = frame.water_degC.row(i);
        for (Eigen::Index j = 0; j + 2 * half <= n; j += std::max<Eigen::Index>(1, half / 2)) {
            const double run = frame.place_m[std::min(j + 2 * half, n) - 1] - frame.place_m[j];
            slopes.push_back((row.segment(j + half, half).mean() - row.segment(j, half).mean()) /
                             std::max(run * 0.5, 1e-6));
        }
        gradient[i] = median(slopes);
    }
    return gradient;
}

/// Hour of day (UTC) of the daily wave's maximum, by least squares on mean, trend and one wave.
double hour_of_maximum(const Frame& frame) {
    const Eigen::Index n = frame.n_time();
    Eigen::MatrixXd a(n, 4);
    for (Eigen::Index i = 0; i < n; ++i) {
        const double phase = frame.time_s[i] * std::numbers::pi / 43200.0;
        a.row(i) << 1.0, (frame.time_s[i] - frame.time_s[0]) / 86400.0, std::cos(phase),
            std::sin(phase);
    }
    const Eigen::VectorXd c = (a.transpose() * a + 1e-9 * Eigen::MatrixXd::Identity(4, 4))
                                  .ldlt()
                                  .solve(a.transpose() * frame.mean_degC.matrix());
    return std::atan2(c[3], c[2]) * 12.0 / std::numbers::pi;
}

} // namespace

double sine_of_sun(double time_s, double longitude_deg, double latitude_deg) {
    const double rad = std::numbers::pi / 180.0;
    const double days = time_s / 86400.0;
    const double year = std::fmod(days, 365.2425) / 365.2425 * 2.0 * std::numbers::pi;
    const double declination = 0.006918 - 0.399912 * std::cos(year) + 0.070257 * std::sin(year) -
                               0.006758 * std::cos(2.0 * year) + 0.000907 * std::sin(2.0 * year);
    const double equation_min =
        229.18 * (0.000075 + 0.001868 * std::cos(year) - 0.032077 * std::sin(year) -
                  0.014615 * std::cos(2.0 * year) - 0.040849 * std::sin(2.0 * year));
    const double hour =
        (days - std::floor(days)) * 24.0 + longitude_deg / 15.0 + equation_min / 60.0;
    return std::sin(latitude_deg * rad) * std::sin(declination) +
           std::cos(latitude_deg * rad) * std::cos(declination) *
               std::cos((hour - 12.0) * 15.0 * rad);
}

Patterns make_patterns(const Frame& frame, const StreamInput& input) {
    Patterns p;
    const Eigen::Index n = frame.n_time();
    p.gradient = usual_gradient(frame);
    p.change = rate_of_change(frame.time_s, frame.mean_degC);
    p.sun = Eigen::ArrayXd::Zero(n);
    p.sun_from_place = input.longitude_deg.has_value() && input.latitude_deg.has_value();
    // streams are warmest some four hours after noon (common practice, no source)
    const double noon = p.sun_from_place ? 0.0 : hour_of_maximum(frame) - 4.0;
    for (Eigen::Index i = 0; i < n; ++i) {
        const double sine =
            p.sun_from_place
                ? sine_of_sun(frame.time_s[i], *input.longitude_deg, *input.latitude_deg)
                : std::cos((frame.time_s[i] / 3600.0 - noon) * std::numbers::pi / 12.0) + 0.1;
        p.sun[i] = std::max(0.0, sine);
    }
    p.night = p.sun <= 0.0;
    p.night_share = double(p.night.count()) / double(n);
    return p;
}

Weighting shut_out(const std::string& name, const Eigen::ArrayXd& series,
                   const std::vector<Eigen::ArrayXd>& patterns, const Mask& use) {
    Weighting w;
    w.name = name;
    Eigen::VectorXd left = use.select(series, 0.0).matrix();
    const double before = left.squaredNorm();
    if (!patterns.empty()) {
        Eigen::MatrixXd a(series.size(), static_cast<Eigen::Index>(patterns.size()));
        for (std::size_t k = 0; k < patterns.size(); ++k) {
            a.col(static_cast<Eigen::Index>(k)) = use.select(patterns[k], 0.0).matrix();
            const double norm = a.col(static_cast<Eigen::Index>(k)).norm();
            if (norm > 0.0)
                a.col(static_cast<Eigen::Index>(k)) /= norm;
        }
        Eigen::MatrixXd normal = a.transpose() * a;
        normal.diagonal().array() += 1e-8;
        left -= a * normal.ldlt().solve(a.transpose() * left);
    }
    const double power = left.dot(use.select(series, 0.0).matrix());
    if (!(power > 1e-8 * before) || before == 0.0)
        return w;
    w.weight = left.array() / power;
    w.total = w.weight.sum();
    w.swing_K = std::sqrt(left.squaredNorm() / std::max(1.0, double(use.count())));
    return w;
}

std::vector<Weighting> make_weightings(const Frame& frame, const Patterns& patterns,
                                       const std::optional<Eigen::ArrayXd>& inflow_degC) {
    const Eigen::Index n = frame.n_time();
    const Eigen::ArrayXd one = Eigen::ArrayXd::Ones(n);
    Mask all(n);
    for (Eigen::Index i = 0; i < n; ++i)
        all[i] = !inflow_degC || std::isfinite((*inflow_degC)[i]);
    const Eigen::ArrayXd inflow =
        inflow_degC ? Eigen::ArrayXd(all.select(*inflow_degC, 0.0)) : Eigen::ArrayXd::Zero(n);
    const Eigen::ArrayXd contrast = inflow - frame.mean_degC;
    std::vector<Weighting> out;
    const auto add = [&](const std::string& name, std::vector<Eigen::ArrayXd> shut, bool constant,
                         const Mask& use, bool nights) {
        if (constant || !inflow_degC)
            shut.push_back(one);
        Weighting w = shut_out(name, contrast, shut, use);
        if (w.weight.size() == 0)
            return;
        w.inflow = (w.weight * inflow).sum();
        w.nights = nights;
        if (!inflow_degC) {
            w.total = 0.0;
            w.inflow = 0.0;
        }
        out.push_back(std::move(w));
    };
    const Eigen::ArrayXd& g = patterns.gradient;
    const Eigen::ArrayXd& c = patterns.change;
    for (const bool constant : {false, true}) {
        if (!constant && !inflow_degC)
            continue;
        const std::string also = constant ? "constants" : "";
        const auto named = [&](const std::string& what) {
            return also.empty() ? what : what.empty() ? also : also + " and " + what;
        };
        add(named(""), {}, constant, all, false);
        add(named("the reach's own heating"), {g}, constant, all, false);
        add(named("changes in time"), {c}, constant, all, false);
        add(named("the reach's own heating and changes in time"), {g, c}, constant, all, false);
        add(named("the sun"), {patterns.sun}, constant, all, false);
        const Mask nights = all && patterns.night;
        if (nights.count() >= 12) {
            add(named("the day"), {}, constant, nights, true);
            add(named("the day and changes in time"), {c}, constant, nights, true);
        }
    }
    return out;
}

Profile make_profile(const Frame& frame, const Weighting& weighting) {
    const double least = 0.05; // of the reach's usual contrast, which is 1
    Profile p;
    const Eigen::ArrayXd a =
        (frame.water_degC.matrix().transpose() * weighting.weight.matrix()).array();
    p.contrast = (weighting.inflow - a).max(least);
    p.value = -p.contrast.log();
    p.white_variance = frame.white_K.square() * frame.correlated * weighting.weight.square().sum() /
                       p.contrast.square();
    return p;
}

} // namespace rillstrand::stream

// SPDX-License-Identifier: Apache-2.0
#include "stream/regime.hpp"

#include "stream/frame.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double day_s = 86400.0;
} // namespace

Eigen::ArrayXd seven_day_means(const Eigen::ArrayXd& daily) {
    const Eigen::Index n = daily.size() - 6;
    Eigen::ArrayXd out(std::max<Eigen::Index>(n, 0));
    for (Eigen::Index i = 0; i < out.size(); ++i)
        out[i] = daily.segment(i, 7).mean(); // a NaN among them makes it NaN
    return out;
}

double seven_day_maximum_degC(const Eigen::ArrayXd& time_s, double interval_s,
                              const Eigen::Ref<const Eigen::ArrayXd>& temperature_degC,
                              double solar_offset_s) {
    if (time_s.size() == 0 || !(interval_s > 0.0))
        return nan;
    const double first = std::floor((time_s[0] + solar_offset_s) / day_s);
    const auto days = static_cast<Eigen::Index>(
        std::floor((time_s[time_s.size() - 1] + solar_offset_s) / day_s) - first + 1.0);
    Eigen::ArrayXd most = Eigen::ArrayXd::Constant(days, -std::numeric_limits<double>::infinity());
    Eigen::ArrayXd seen = Eigen::ArrayXd::Zero(days);
    for (Eigen::Index i = 0; i < time_s.size(); ++i) {
        if (!std::isfinite(temperature_degC[i]))
            continue;
        const auto d =
            static_cast<Eigen::Index>(std::floor((time_s[i] + solar_offset_s) / day_s) - first);
        most[d] = std::max(most[d], temperature_degC[i]);
        seen[d] += interval_s;
    }
    const Eigen::ArrayXd means = seven_day_means((seen >= 0.9 * day_s).select(most, nan));
    double greatest = nan;
    for (const double m : means)
        if (std::isfinite(m) && !(greatest >= m))
            greatest = m;
    return greatest;
}

double hours_above(const Eigen::Ref<const Eigen::ArrayXd>& temperature_degC, double threshold_degC,
                   double interval_s) {
    return double((temperature_degC > threshold_degC).count()) * interval_s / 3600.0;
}

std::vector<Refuge> find_refuges(const StreamInput& input, const Eigen::ArrayXd& usable,
                                 double colder_by_K, double solar_offset_s) {
    std::vector<Refuge> out;
    std::vector<Eigen::Index> rows;
    std::vector<double> ambient;
    for (Eigen::Index i = 0; i < input.time_s.size(); ++i) {
        const double hour =
            std::fmod(std::fmod(input.time_s[i] + solar_offset_s, day_s) + day_s, day_s) / 3600.0;
        if (hour < 11.0 || hour >= 19.0)
            continue;
        std::vector<double> values;
        for (Eigen::Index j = 0; j < input.fibre_m.size(); ++j)
            if (usable[j] > 0.0)
                values.push_back(input.temperature_degC(i, j));
        const double m = median(std::move(values));
        if (std::isfinite(m)) {
            rows.push_back(i);
            ambient.push_back(m);
        }
    }
    bool open = false;
    double sum = 0.0, there = 0.0, n = 0.0, channels = 0.0;
    const auto close = [&](double to_m) {
        if (open && n > 0.0) {
            out.back().to_m = to_m;
            out.back().colder_by_c = sum / channels;
            out.back().persistence = there / n;
        }
        open = false;
        sum = there = n = channels = 0.0;
    };
    double last_m = nan;
    for (Eigen::Index j = 0; j < input.fibre_m.size(); ++j) {
        double colder = 0.0, count = 0.0, often = 0.0;
        for (std::size_t k = 0; k < rows.size(); ++k) {
            const double d = ambient[k] - input.temperature_degC(rows[k], j);
            if (std::isfinite(d)) {
                colder += d;
                count += 1.0;
                often += d >= colder_by_K ? 1.0 : 0.0;
            }
        }
        const bool cold = usable[j] > 0.0 && count > 0.0 && colder / count >= colder_by_K;
        if (!cold) {
            close(last_m);
            continue;
        }
        if (!open) {
            out.push_back({input.fibre_m[j], input.fibre_m[j], 0.0, 0.0});
            open = true;
        }
        last_m = input.fibre_m[j];
        sum += colder / count;
        there += often;
        n += count;
        channels += 1.0;
    }
    close(last_m);
    return out;
}

} // namespace rillstrand::stream

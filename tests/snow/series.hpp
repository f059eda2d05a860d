// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "snow/snow.hpp"

#include <numbers>
#include <random>

/// Hand-made days of one channel or more, for tests of rules.
namespace rillstrand::snow_test {

struct Day {
    double mean_degC, range_K;
};

/// Hourly temperatures of one channel: each day a sine of that mean and range.
inline snow::SnowInput hourly(const std::vector<Day>& days, double noise_K = 0.0,
                              std::uint64_t seed = 1) {
    std::mt19937_64 random{seed};
    std::normal_distribution<> noise{0.0, 1.0};
    snow::SnowInput input;
    const auto n = static_cast<Eigen::Index>(24 * days.size());
    const double first_s = 1'924'992'000.0; // 2031-01-01
    input.bin_s = 3600.0;
    input.time_s.resize(n);
    input.temperature_degC.resize(n, 1);
    input.fibre_m = Eigen::ArrayXd::Constant(1, 100.0);
    input.config.stretch = "slope";
    input.config.utc_offset_h = 0.0;
    for (Eigen::Index i = 0; i < n; ++i) {
        const Day& day = days[static_cast<std::size_t>(i / 24)];
        const double hour = static_cast<double>(i % 24) + 0.5;
        input.time_s(i) = first_s + 3600.0 * (static_cast<double>(i) + 0.5);
        input.temperature_degC(i, 0) = static_cast<float>(
            day.mean_degC + 0.5 * day.range_K * std::cos((hour - 14.0) * std::numbers::pi / 12.0) +
            noise_K * noise(random));
    }
    return input;
}

inline std::vector<Day> repeat(std::initializer_list<std::pair<int, Day>> pieces) {
    std::vector<Day> days;
    for (const auto& [count, day] : pieces)
        days.insert(days.end(), static_cast<std::size_t>(count), day);
    return days;
}

} // namespace rillstrand::snow_test

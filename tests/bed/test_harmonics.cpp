// SPDX-License-Identifier: Apache-2.0
#include "bed/harmonics.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>
#include <random>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

namespace {

constexpr double two_pi = 6.283185307179586;
constexpr double missing = std::numeric_limits<double>::quiet_NaN();

struct Series {
    Eigen::ArrayXd time_s, values;
};

/// 12 + 1.5 cos(2 pi (t - 16) / 24) + 0.3 cos(4 pi (t - 3) / 24), hourly, t in hours.
Series two_waves(Eigen::Index n) {
    Series s{Eigen::ArrayXd(n), Eigen::ArrayXd(n)};
    for (Eigen::Index i = 0; i < n; ++i) {
        const double t = static_cast<double>(i);
        s.time_s(i) = 3600.0 * t + 86400.0 * 20000.0;
        s.values(i) = 12.0 + 1.5 * std::cos(two_pi * (t - 16.0) / 24.0) +
                      0.3 * std::cos(2.0 * two_pi * (t - 3.0) / 24.0);
    }
    return s;
}

} // namespace

TEST_CASE("a harmonic fit finds the waves it was made of", "[bed][published]") {
    // Worked by hand: mean 12, amplitude 1.5 with its peak at 16 h, 0.3 at 3 h.
    Series s = two_waves(48);
    const auto check = [&] {
        const bed::Harmonic h = bed::fit_harmonic(s.time_s, s.values);
        CHECK_THAT(h.mean, WithinAbs(12.0, 1e-10));
        CHECK_THAT(h.amplitude, WithinAbs(1.5, 1e-10));
        CHECK_THAT(24.0 * h.phase_rad / two_pi, WithinAbs(16.0, 1e-9));
        CHECK_THAT(h.second_amplitude, WithinAbs(0.3, 1e-10));
        CHECK_THAT(12.0 * h.second_phase_rad / two_pi, WithinAbs(3.0, 1e-8));
        CHECK(h.residual < 1e-10);
    };
    check();
    for (const Eigen::Index i : {0, 3, 7, 8, 20, 21, 30, 33, 40, 47})
        s.values(i) = missing;
    check();
    // A trend is fitted, not taken for part of the wave.
    s = two_waves(48);
    for (Eigen::Index i = 0; i < 48; ++i)
        s.values(i) += 0.05 * (static_cast<double>(i) - 23.5);
    check();
    CHECK_THAT(bed::fit_harmonic(s.time_s, s.values).trend_per_d, WithinAbs(1.2, 1e-9));
}

TEST_CASE("too little of a day has no wave", "[bed][property]") {
    Series s = two_waves(48);
    for (Eigen::Index i = 0; i < 48; ++i)
        if (i % 24 > 9)
            s.values(i) = missing;
    CHECK(std::isnan(bed::fit_harmonic(s.time_s, s.values).amplitude));
}

TEST_CASE("the sd of amplitude and phase is right under noise", "[bed][property]") {
    std::mt19937_64 random{3};
    std::normal_distribution<double> normal;
    int inside = 0, phase_inside = 0;
    constexpr int runs = 400;
    for (int r = 0; r < runs; ++r) {
        Series s = two_waves(48);
        for (double& v : s.values)
            v += 0.2 * normal(random);
        const bed::Harmonic h = bed::fit_harmonic(s.time_s, s.values);
        inside += std::abs(h.amplitude - 1.5) < 2.0 * h.amplitude_sd ? 1 : 0;
        phase_inside += std::abs(h.phase_rad - two_pi * 16.0 / 24.0) < 2.0 * h.phase_sd_rad ? 1 : 0;
    }
    CHECK(inside > 0.90 * runs);
    CHECK(inside < 0.99 * runs);
    CHECK(phase_inside > 0.90 * runs);
    CHECK(phase_inside < 0.99 * runs);
}

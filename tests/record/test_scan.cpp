// SPDX-License-Identifier: Apache-2.0
#include "record/bin.hpp"
#include "record/scan.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <numbers>
#include <random>

using namespace rillstrand;

namespace {

record::Axes axes_of(Eigen::Index n_time, Eigen::Index n_place, double interval_s) {
    record::Axes axes;
    axes.time_s =
        22369.0 * 86400.0 + // 2031-03-31T00:00:00Z
        interval_s * Eigen::ArrayXd::LinSpaced(n_time, 0.0, static_cast<double>(n_time - 1));
    axes.interval_s = interval_s;
    axes.distance_m = Eigen::ArrayXd::LinSpaced(n_place, 0.0, static_cast<double>(n_place - 1));
    return axes;
}

/// A day wave with noise, on hundredths, with gaps.
record::MemorySource wave(Eigen::Index n_time, Eigen::Index n_place, double noise_K,
                          unsigned seed) {
    const record::Axes axes = axes_of(n_time, n_place, 300.0);
    std::mt19937_64 random{seed};
    std::normal_distribution<double> noise{0.0, noise_K};
    Eigen::ArrayXXf t(n_time, n_place);
    for (Eigen::Index j = 0; j < n_place; ++j)
        for (Eigen::Index i = 0; i < n_time; ++i) {
            const double hours = axes.time_s(i) / 3600.0;
            const double value = 12.0 + 0.01 * static_cast<double>(j) +
                                 1.5 * std::cos(2.0 * std::numbers::pi * (hours - 16.0) / 24.0) +
                                 0.3 * std::cos(4.0 * std::numbers::pi * (hours - 3.0) / 24.0) +
                                 noise(random);
            t(i, j) =
                random() % 50U == 0 ? NAN : static_cast<float>(std::round(value * 100.0) / 100.0);
        }
    return record::MemorySource{axes, t};
}

record::ScanSummary scan(const record::Source& source, record::ScanOptions options = {}) {
    NoProgress progress;
    return record::scan(source, options, progress);
}

} // namespace

// H-10, H-11: the wave of mean 12, 1.5 at 16 h and 0.3 at 3 h is found; samples left out change
// nothing.
TEST_CASE("the harmonic fit returns the wave that was put in", "[record]") {
    record::Axes axes = axes_of(48, 2, 3600.0);
    Eigen::ArrayXXf t(48, 2);
    for (Eigen::Index i = 0; i < 48; ++i) {
        const double hour = static_cast<double>(i);
        t.row(i).setConstant(static_cast<float>(
            12.0 + 1.5 * std::cos(2.0 * std::numbers::pi * (hour - 16.0) / 24.0) +
            0.3 * std::cos(4.0 * std::numbers::pi * (hour - 3.0) / 24.0)));
    }
    for (const Eigen::Index i : {3, 7, 8, 20, 21, 22, 30, 33, 40, 46})
        t(i, 1) = NAN;
    const auto summary = scan(record::MemorySource{axes, t});
    const double float_rounding = 2e-6;
    for (Eigen::Index j = 0; j < 2; ++j) {
        CHECK(summary.diurnal_amplitude_K(j) == Approx(1.5).margin(float_rounding));
        CHECK(summary.diurnal_phase_h(j) == Approx(16.0).margin(1e-5));
        CHECK(summary.semidiurnal_amplitude_K(j) == Approx(0.3).margin(float_rounding));
    }
    CHECK(summary.mean_degC(0) == Approx(12.0).margin(float_rounding));
}

// H-12: a trend is fitted beside the wave and does not change it.
TEST_CASE("a linear trend does not bias the wave", "[record]") {
    const record::Axes axes = axes_of(60, 1, 3600.0);
    Eigen::ArrayXXf t(60, 1);
    for (Eigen::Index i = 0; i < 60; ++i)
        t(i, 0) = static_cast<float>(
            2.0 + 0.5 * (axes.time_s(i) - axes.time_s(0)) / 86400.0 +
            std::cos(2.0 * std::numbers::pi * (axes.time_s(i) / 3600.0 - 6.0) / 24.0));
    const auto summary = scan(record::MemorySource{axes, t});
    CHECK(summary.diurnal_amplitude_K(0) == Approx(1.0).margin(1e-5));
    CHECK(summary.diurnal_phase_h(0) == Approx(6.0).margin(1e-4));
    CHECK(summary.trend_Kd(0) == Approx(0.5).margin(1e-5));
}

TEST_CASE("moments and quantiles agree with sorting and summing", "[record][property]") {
    const record::MemorySource source = wave(700, 3, 0.2, 42);
    const auto summary = scan(source);
    Eigen::ArrayXXf t(700, 3);
    source.read(record::Quantity::temperature, 0, 0, t);
    for (Eigen::Index j = 0; j < 3; ++j) {
        std::vector<double> values;
        for (Eigen::Index i = 0; i < 700; ++i)
            if (!std::isnan(t(i, j)))
                values.push_back(static_cast<double>(t(i, j)));
        std::sort(values.begin(), values.end());
        const auto n = static_cast<double>(values.size());
        double sum = 0.0, square = 0.0;
        for (const double v : values)
            sum += v;
        for (const double v : values)
            square += (v - sum / n) * (v - sum / n);
        CHECK(summary.n(j) == n);
        CHECK(summary.mean_degC(j) == Approx(sum / n).epsilon(1e-12));
        CHECK(summary.sd_degC(j) == Approx(std::sqrt(square / (n - 1.0))).epsilon(1e-10));
        CHECK(summary.min_degC(j) == values.front());
        CHECK(summary.max_degC(j) == values.back());
        const double at = 0.05 * (n - 1.0);
        const auto k = static_cast<std::size_t>(at);
        const double p05 = values[k] + (at - std::floor(at)) * (values[k + 1] - values[k]);
        CHECK(summary.p05_degC(j) == Approx(p05).margin(1e-5));
    }
}

TEST_CASE("noise is told from second differences whatever the signal", "[record][property]") {
    const double noise_K = GENERATE(0.03, 0.1, 0.5);
    const auto summary = scan(wave(3000, 4, noise_K, 7));
    // 3000 samples: about 2.5 % error each; hundredths add 0.0029 K of rounding.
    for (Eigen::Index j = 0; j < 4; ++j)
        CHECK(summary.noise_K(j) == Approx(noise_K).epsilon(0.10).margin(0.003));
}

TEST_CASE("the scan does not depend on tiles, blocks or threads", "[record][property]") {
    const record::MemorySource source = wave(900, 70, 0.1, 3);
    const auto whole = scan(source);
    for (const auto& options : {record::ScanOptions{1, 1}, record::ScanOptions{7, 100},
                                record::ScanOptions{64, 899}, record::ScanOptions{256, 5000}}) {
        const auto tiled = scan(source, options);
        CHECK((tiled.mean_degC == whole.mean_degC).all());
        CHECK((tiled.sd_degC == whole.sd_degC).all());
        CHECK((tiled.p95_degC == whole.p95_degC).all());
        CHECK((tiled.daily_range_K == whole.daily_range_K).all());
        CHECK((tiled.diurnal_amplitude_K == whole.diurnal_amplitude_K).all());
        CHECK((tiled.diurnal_phase_h == whole.diurnal_phase_h).all());
        CHECK((tiled.noise_K == whole.noise_K).all());
    }
}

TEST_CASE("an empty channel is missing and a short record has no wave", "[record]") {
    Eigen::ArrayXXf t = Eigen::ArrayXXf::Constant(20, 2, 5.0F);
    t.col(1).setConstant(NAN);
    const auto summary = scan(record::MemorySource{axes_of(20, 2, 300.0), t});
    CHECK(summary.n(1) == 0.0);
    CHECK(std::isnan(summary.mean_degC(1)));
    CHECK(std::isnan(summary.diurnal_amplitude_K(0)));
    CHECK(summary.noise_K(0) == Approx(0.0).margin(0.003));
}

TEST_CASE("the daily range is the mean of each day's maximum minus minimum", "[record]") {
    record::Axes axes = axes_of(72, 1, 3600.0);
    Eigen::ArrayXXf t = Eigen::ArrayXXf::Zero(72, 1);
    t(5, 0) = 3.0F;   // first day: range 3
    t(30, 0) = -1.0F; // second day: range 1
    t(60, 0) = 2.0F;  // third day: range 2
    CHECK(scan(record::MemorySource{axes, t}).daily_range_K(0) == Approx(2.0));
}

TEST_CASE("bins hold the means of their samples", "[record]") {
    record::Axes axes = axes_of(5, 3, 300.0);
    axes.time_s(4) += 7200.0; // a gap: bins without samples are left out
    Eigen::ArrayXXf t(5, 3);
    t << 1, 2, 3, 2, NAN, 4, 3, NAN, 5, 4, 4, 6, 9, 9, 9;
    NoProgress progress;
    const auto binned = record::bin(record::MemorySource{axes, t}, {1, 2}, 600.0, progress);
    REQUIRE(binned.time_s.size() == 3);
    CHECK(binned.time_s(0) == axes.time_s(0) + 300.0);
    CHECK(binned.mean_degC(0, 0) == 2.0F);
    CHECK(binned.count(0, 0) == 1.0F);
    CHECK(binned.mean_degC(0, 1) == 3.5F);
    CHECK(binned.mean_degC(1, 0) == 4.0F);
    CHECK(binned.mean_degC(2, 1) == 9.0F);
    CHECK(record::choose_bin_s(axes, 100, 600.0, 1e9) == 600.0);
    CHECK(record::choose_bin_s(axes, 100, 1000.0, 1e9) == 1200.0);
}

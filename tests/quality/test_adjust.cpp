// SPDX-License-Identifier: Apache-2.0
#include "quality/adjust.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <cstdlib>
#include <iostream>
#include <numbers>
#include <random>

using namespace rillstrand;
using Catch::Matchers::Contains;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;

/// An invented cable in a stream: water with a day's wave, a warm spring, shade; three baths;
/// powers as light makes them, with shot noise, drifting gains, attenuation and losses at two
/// splices.
struct Cable {
    std::vector<std::pair<double, double>> losses{{350.0, 0.010}, {700.0, -0.006}};
    double gamma_K = 482.0, dalpha_1_m = 8.9e-5, counts = 4.0e6;
    double bath_sd_K = 0.0;
    Eigen::Index n_time = 288, n_place = 1000;
};

struct Made {
    std::unique_ptr<record::MemorySource> source;
    std::vector<quality::AdjustBath> baths;
    Eigen::ArrayXXd truth_degC;
    double shot_K = 0.0; ///< of one sample, mean along the fibre
};

Made make(const Cable& cable, std::uint64_t seed) {
    std::mt19937_64 random{seed};
    std::normal_distribution<double> normal;
    Made made;
    record::Axes axes{
        Eigen::ArrayXd::LinSpaced(cable.n_time, 0.0, 600.0 * static_cast<double>(cable.n_time - 1)),
        600.0,
        Eigen::ArrayXd::LinSpaced(cable.n_place, 0.0, static_cast<double>(cable.n_place - 1))};
    made.truth_degC.resize(cable.n_time, cable.n_place);
    const auto bath_at = [](double x) {
        return x >= 20 && x <= 45 ? 0 : (x >= 55 && x <= 80 ? 1 : (x >= 955 && x <= 985 ? 2 : -1));
    };
    const auto bath_degC = [](int bath, double t) {
        return bath == 0 ? 1.0 : (bath == 1 ? 24.0 + 0.5 * std::sin(t / 3e4) : 9.0);
    };
    for (Eigen::Index i = 0; i < cable.n_time; ++i)
        for (Eigen::Index j = 0; j < cable.n_place; ++j) {
            const double x = axes.distance_m(j), t = axes.time_s(i);
            double water = 13.0 + 2.5 * std::sin(two_pi * t / 86400.0) + 0.8 * std::sin(x / 150.0);
            if (x > 500.0)
                water += 0.06 * (9.5 - water);
            const int bath = bath_at(x);
            made.truth_degC(i, j) = bath >= 0 ? bath_degC(bath, t) : water;
        }
    Eigen::ArrayXXf stokes(cable.n_time, cable.n_place), anti = stokes;
    double c = 1.5, shot = 0.0;
    for (Eigen::Index i = 0; i < cable.n_time; ++i) {
        c += 2e-4 * normal(random);
        for (Eigen::Index j = 0; j < cable.n_place; ++j) {
            const double x = axes.distance_m(j), kelvin = made.truth_degC(i, j) + 273.15;
            double logarithm = cable.gamma_K / kelvin - c + cable.dalpha_1_m * x;
            for (const auto& [at_m, size] : cable.losses)
                if (x > at_m)
                    logarithm += size;
            const double s = cable.counts * std::exp(-4e-4 * x), a = s / std::exp(logarithm);
            stokes(i, j) = static_cast<float>(s + std::sqrt(s) * normal(random));
            anti(i, j) = static_cast<float>(a + std::sqrt(a) * normal(random));
            shot += kelvin * kelvin / cable.gamma_K * std::sqrt(1.0 / s + 1.0 / a);
        }
    }
    made.shot_K = shot / static_cast<double>(cable.n_time * cable.n_place);
    made.source = std::make_unique<record::MemorySource>(axes, made.truth_degC.cast<float>());
    made.source->add(record::Quantity::stokes, stokes);
    made.source->add(record::Quantity::antistokes, anti);
    const double ends[3][2] = {{20, 45}, {55, 80}, {955, 985}};
    for (int b = 0; b < 3; ++b) {
        quality::BathReference reference{Eigen::ArrayXd(cable.n_time), cable.bath_sd_K};
        const double wrong_K = cable.bath_sd_K * normal(random);
        for (Eigen::Index i = 0; i < cable.n_time; ++i)
            reference.temperature_degC(i) = bath_degC(b, axes.time_s(i)) + wrong_K;
        made.baths.push_back({"bath " + std::to_string(b),
                              quality::inner_places(axes, ends[b][0], ends[b][1], 1.0), reference});
    }
    return made;
}

Eigen::ArrayXXd errors_K(const Made& made, const quality::Adjustment& how) {
    const auto source = quality::adjusted(*made.source, how);
    Eigen::ArrayXXf out(made.truth_degC.rows(), made.truth_degC.cols());
    source->read(record::Quantity::temperature, 0, 0, out);
    return out.cast<double>() - made.truth_degC;
}

} // namespace

TEST_CASE("powers give temperatures back through two losses and drifting gains",
          "[quality][property]") {
    double inside = 0.0, channels = 0.0;
    for (std::uint64_t seed = 1; seed <= 6; ++seed) {
        Cable cable;
        cable.bath_sd_K = 0.02;
        const Made made = make(cable, seed);
        const auto how = quality::adjust_raman(*made.source, made.baths, 1.0);
        const Eigen::ArrayXXd off = errors_K(made, how);
        CHECK(how.warnings.empty());
        REQUIRE(how.steps.size() == 2);
        CHECK(how.steps[0].at_m == Approx(350.5).margin(1.1));
        CHECK(how.steps[1].at_m == Approx(700.5).margin(1.1));
        CHECK(std::sqrt(off.square().mean()) < 1.4 * std::hypot(made.shot_K, cable.bath_sd_K));
        for (const auto& [from, to] :
             {std::pair{90, 340}, std::pair{360, 690}, std::pair{710, 950}}) {
            const double bias_K = off.middleCols(from, to - from).mean();
            if (std::getenv("RILLSTRAND_TALK") != nullptr)
                std::cout << seed << " part from " << from << " bias " << bias_K << " sd "
                          << how.channel_sd_K((from + to) / 2) << " gamma " << how.gamma_K << " +- "
                          << how.gamma_sd_K << " rms " << std::sqrt(off.square().mean()) << " shot "
                          << made.shot_K << '\n';
            CHECK(std::abs(bias_K) < 0.06 + 2.0 * cable.bath_sd_K);
            inside += std::abs(bias_K) < 2.0 * how.channel_sd_K((from + to) / 2) ? 1.0 : 0.0;
            channels += 1.0;
        }
        CHECK(std::abs(how.gamma_K - cable.gamma_K) < 3.0 * how.gamma_sd_K);
        CHECK(std::abs(how.dalpha_1_m - cable.dalpha_1_m) < 3.0 * how.dalpha_sd_1_m);
    }
    CHECK(inside >= 0.85 * channels);
}

TEST_CASE("an inflow is no loss", "[quality][property]") {
    Cable cable;
    cable.losses.clear();
    const Made made = make(cable, 11);
    CHECK(quality::adjust_raman(*made.source, made.baths, 1.0).steps.empty());
}

TEST_CASE("too few baths are refused with the unknown that is missing", "[quality]") {
    Made made = make({}, 3);
    std::vector<quality::AdjustBath> two{made.baths[0], made.baths[1]};
    CHECK_THROWS_WITH(quality::adjust_raman(*made.source, two, 1.0), Contains("cannot be had"));
    CHECK_THROWS_WITH(quality::adjust_offset(*made.source, {made.baths[0]}, true, 1.0),
                      Contains("the slope along the fibre cannot be had"));
    const record::MemorySource bare{made.source->axes(), made.truth_degC.cast<float>()};
    CHECK_THROWS_WITH(quality::adjust_raman(bare, made.baths, 1.0),
                      Contains("needs Stokes and anti-Stokes powers"));
}

TEST_CASE("offset and slope are taken out and their doubt is told", "[quality][property]") {
    double inside = 0.0, n = 0.0;
    for (std::uint64_t seed = 1; seed <= 40; ++seed) {
        std::mt19937_64 random{seed};
        std::normal_distribution<double> normal;
        const Eigen::Index n_time = 200, n_place = 300;
        record::Axes axes{Eigen::ArrayXd::LinSpaced(n_time, 0.0, 300.0 * 199), 300.0,
                          Eigen::ArrayXd::LinSpaced(n_place, 0.0, 299.0)};
        Eigen::ArrayXXf seen(n_time, n_place);
        double drift_K = 0.4;
        for (Eigen::Index i = 0; i < n_time; ++i) {
            drift_K += 0.004 * normal(random);
            for (Eigen::Index j = 0; j < n_place; ++j)
                seen(i, j) = static_cast<float>(12.0 + drift_K + 8e-4 * axes.distance_m(j) +
                                                0.1 * normal(random));
        }
        const record::MemorySource source{axes, seen};
        const double sd_K = 0.03;
        std::vector<quality::AdjustBath> baths;
        for (const double from : {10.0, 260.0})
            baths.push_back(
                {"bath", quality::inner_places(axes, from, from + 25.0, 1.0),
                 quality::constant_reference(n_time, 12.0 + sd_K * normal(random), sd_K)});
        const auto how = quality::adjust_offset(source, baths, true, 1.0);
        const auto adjusted = quality::adjusted(source, how);
        Eigen::ArrayXXf out(n_time, n_place);
        adjusted->read(record::Quantity::temperature, 0, 0, out);
        for (const Eigen::Index j : {5, 150, 295}) {
            const double bias_K = out.middleCols(j - 4, 8).cast<double>().mean() - 12.0;
            inside += std::abs(bias_K) < 2.0 * how.channel_sd_K(j) ? 1.0 : 0.0;
            n += 1.0;
        }
        CHECK((out.cast<double>() - 12.0).square().mean() < 0.13 * 0.13);
    }
    CHECK(inside / n >= 0.88);
}

// SPDX-License-Identifier: Apache-2.0
#include "quality/baths.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <random>

using namespace rillstrand;

namespace {

record::Axes axes_of(Eigen::Index n_time, Eigen::Index n_place) {
    record::Axes axes;
    axes.time_s = Eigen::ArrayXd::LinSpaced(n_time, 0.0, 300.0 * static_cast<double>(n_time - 1));
    axes.interval_s = 300.0;
    axes.distance_m = Eigen::ArrayXd::LinSpaced(n_place, 0.0, static_cast<double>(n_place - 1));
    return axes;
}

campaign::Bath bath_between(double from_m, double to_m) {
    campaign::Bath bath;
    bath.name = "ice bath";
    bath.from_m = from_m;
    bath.to_m = to_m;
    return bath;
}

} // namespace

TEST_CASE("bias, rmse, drift and gradient of a bath by hand", "[quality]") {
    const record::Axes axes = axes_of(289, 40);
    Eigen::ArrayXXf temperature_degC(289, 40);
    for (Eigen::Index i = 0; i < 289; ++i)
        for (Eigen::Index j = 0; j < 40; ++j) {
            const double days = axes.time_s(i) / 86400.0;
            temperature_degC(i, j) =
                static_cast<float>(0.2 + 0.1 * (days - 0.5) + 0.01 * (axes.distance_m(j) - 19.0));
        }
    const record::MemorySource source{axes, temperature_degC};
    const auto result = quality::assess_bath(source, bath_between(10.0, 28.0),
                                             quality::constant_reference(289, 0.0, 0.03), 1.0);
    CHECK(result.from_m == 12.0);
    CHECK(result.to_m == 26.0);
    CHECK(result.channels == 15);
    CHECK(result.samples == 15 * 289);
    CHECK(result.bias_c == Approx(0.2).margin(1e-6));
    CHECK(result.drift_kd == Approx(0.1).margin(1e-6));
    CHECK(result.gradient_km == Approx(0.01).margin(1e-6));
    CHECK_FALSE(result.stirred);
    // Mean square: bias, plus uniform spread in time (1/12 for one day, n points), plus in space.
    const double time_var = 0.01 * (289.0 + 1.0) / (12.0 * 288.0);
    const double space_var = 1e-4 * (15.0 * 15.0 - 1.0) / 12.0;
    CHECK(result.rmse_c == Approx(std::sqrt(0.04 + time_var + space_var)).margin(1e-5));
}

TEST_CASE("times without a reference and missing samples are left out", "[quality]") {
    const record::Axes axes = axes_of(4, 10);
    Eigen::ArrayXXf temperature_degC = Eigen::ArrayXXf::Constant(4, 10, 5.5F);
    temperature_degC.row(0).setConstant(90.0F);
    temperature_degC(1, 5) = std::numeric_limits<float>::quiet_NaN();
    quality::BathReference reference = quality::constant_reference(4, 5.0, 0.0);
    reference.temperature_degC(0) = std::numeric_limits<double>::quiet_NaN();
    const auto result = quality::assess_bath(record::MemorySource{axes, temperature_degC},
                                             bath_between(0.0, 9.0), reference, 1.0);
    CHECK(result.samples == 3 * result.channels - 1);
    CHECK(result.bias_c == Approx(0.5));
    CHECK(result.stirred);
}

TEST_CASE("the stated sd of a bath's bias covers noise", "[quality][property]") {
    const record::Axes axes = axes_of(50, 30);
    int inside = 0;
    constexpr int seeds = 300;
    for (unsigned seed = 0; seed < seeds; ++seed) {
        std::mt19937_64 random{seed};
        std::normal_distribution<double> noise{0.0, 0.1};
        std::normal_distribution<double> probe{0.0, 0.005};
        const double probe_error_K = probe(random);
        Eigen::ArrayXXf temperature_degC(50, 30);
        for (Eigen::Index i = 0; i < 50; ++i)
            for (Eigen::Index j = 0; j < 30; ++j)
                temperature_degC(i, j) = static_cast<float>(noise(random));
        const auto result = quality::assess_bath(
            record::MemorySource{axes, temperature_degC}, bath_between(0.0, 29.0),
            quality::constant_reference(50, probe_error_K, 0.005), 1.0);
        if (std::abs(result.bias_c) < 2.0 * result.bias_sd_c)
            ++inside;
    }
    CHECK(inside > 0.90 * seeds);
    CHECK(inside < 0.99 * seeds);
}

TEST_CASE("a bath outside the record is refused by name", "[quality]") {
    const record::MemorySource source{axes_of(2, 10), Eigen::ArrayXXf::Zero(2, 10)};
    CHECK_THROWS_WITH(quality::assess_bath(source, bath_between(100.0, 120.0),
                                           quality::constant_reference(2, 0.0, 0.0), 1.0),
                      "bath 'ice bath': no channel lies between 100 and 120 m; the record reaches "
                      "from 0 to 9 m");
}

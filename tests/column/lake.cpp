// SPDX-License-Identifier: Apache-2.0
#include "lake.hpp"

#include "record/winding.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace rillstrand::simulated {

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr double datum_elevation_m = 400.0;

double level_m(const Lake& lake, double time_s) {
    return datum_elevation_m + lake.level_change_m * std::sin(two_pi * time_s / (2.0 * 86400.0));
}

} // namespace

double Lake::temperature_degC(double z, double time_s) const {
    const double heave = wave_m * std::sin(std::numbers::pi * std::clamp(z / depth_m, 0.0, 1.0)) *
                         std::cos(two_pi * time_s / (3600.0 * wave_period_h));
    const double at = z - heave;
    if (mixed)
        return bottom_degC + 0.1 * std::sin(two_pi * time_s / (5.0 * 86400.0));
    if (ice) // half a winter of conduction into water near its densest
        return 4.0 * std::erf(std::max(at, 0.0) / (2.0 * front_sd_m));
    const double front = 0.5 * std::erfc((at - front_m) / (front_sd_m * std::sqrt(2.0)));
    const double sun = std::max(0.0, std::sin(two_pi * (time_s / 86400.0 - 0.35)));
    return bottom_degC + (surface_degC - bottom_degC) * front +
           day_warming_K * sun * std::exp(-std::max(z, 0.0) / 0.7);
}

column::ColumnInput observe(const Lake& lake, const Cable& cable, double days,
                            std::mt19937_64& random) {
    column::ColumnInput input;
    campaign::Column& config = input.config;
    config.name = "mast";
    config.datum_fibre_m = 1500.0;
    config.datum_elevation_m = datum_elevation_m;
    config.winding = cable.winding;
    const double rise = record::height_per_fibre(cable.winding);
    const auto n =
        static_cast<Eigen::Index>((cable.above_m + lake.depth_m) / rise / cable.spacing_m);
    // The first channel stands at no round number: the sampling grid is the instrument's.
    std::uniform_real_distribution<double> phase{0.0, cable.spacing_m};
    const double first_m = config.datum_fibre_m - cable.above_m / rise + phase(random);
    input.fibre_m = Eigen::ArrayXd::LinSpaced(
        n, first_m, first_m + cable.spacing_m * static_cast<double>(n - 1));
    constexpr Eigen::Index traces = 6;
    const auto bins = static_cast<Eigen::Index>(days * 48.0);
    input.bin_s = 1800.0;
    input.time_s =
        Eigen::ArrayXd::LinSpaced(bins, 900.0, 900.0 + 1800.0 * static_cast<double>(bins - 1));
    input.level_m = input.time_s.unaryExpr([&](double t) { return level_m(lake, t); });
    input.spatial_response_m = cable.response_m;
    std::normal_distribution<double> noise{0.0, cable.noise_K};
    const double box_m = cable.response_m / 0.8 * rise; // 10 to 90 % of a box is 0.8 of its width
    const auto seen = [&](double fibre_m, double t) {
        const double z0 =
            column::depths_below_datum_m(Eigen::ArrayXd::Constant(1, fibre_m), config)(0) +
            level_m(lake, t) - datum_elevation_m;
        double sum = 0.0;
        constexpr int points = 21;
        for (int k = 0; k < points; ++k) {
            const double z = z0 + box_m * ((k + 0.5) / points - 0.5);
            sum += z < 0.0 ? lake.air_degC : lake.temperature_degC(std::min(z, lake.depth_m), t);
        }
        return sum / points;
    };
    input.temperature_degC.resize(bins, n);
    input.samples = Eigen::ArrayXXf::Constant(bins, n, static_cast<float>(traces));
    input.single_degC.resize(120, n);
    for (Eigen::Index j = 0; j < n; ++j) {
        for (Eigen::Index i = 0; i < bins; ++i) {
            double sum = 0.0;
            for (Eigen::Index k = 0; k < traces; ++k)
                sum += seen(input.fibre_m(j),
                            input.time_s(i) + 300.0 * (static_cast<double>(k) - 2.5)) +
                       noise(random);
            input.temperature_degC(i, j) = static_cast<float>(sum / static_cast<double>(traces));
        }
        for (Eigen::Index i = 0; i < input.single_degC.rows(); ++i)
            input.single_degC(i, j) = static_cast<float>(
                seen(input.fibre_m(j), 300.0 * static_cast<double>(i)) + noise(random));
    }
    return input;
}

column::Profile true_profile(const Lake& lake, double time_s, double bottom_m) {
    const auto n = static_cast<Eigen::Index>(std::lround(bottom_m / 0.01)) + 1;
    column::Profile p;
    p.depth_m = Eigen::ArrayXd::LinSpaced(n, 0.0, 0.01 * static_cast<double>(n - 1));
    p.temperature_degC =
        p.depth_m.unaryExpr([&](double z) { return lake.temperature_degC(z, time_s); });
    p.density_kg_m3 = column::densities(p.temperature_degC, 0.0);
    return p;
}

} // namespace rillstrand::simulated

// SPDX-License-Identifier: Apache-2.0
#include "simulator.hpp"

#include "bed/depths.hpp"

#include <cmath>
#include <vector>

namespace rillstrand::beds {

namespace {

using Eigen::ArrayXd;
using Eigen::Index;
constexpr double pi = 3.14159265358979323846;
constexpr double water_J_m3_K = 4.18e6;
constexpr double start_s = 1.9e9 - 1.9e9 / 86400.0 + 8000.0; // some morning
constexpr double spin_up_s = 15.0 * 86400.0;

/// A slow random wander of unit size with a memory.
ArrayXd wander(Index n, double step_s, double memory_s, std::mt19937_64& random) {
    std::normal_distribution<double> normal;
    const double keep = std::exp(-step_s / memory_s);
    ArrayXd x(n);
    x(0) = normal(random);
    for (Index i = 1; i < n; ++i)
        x(i) = keep * x(i - 1) + std::sqrt(1.0 - keep * keep) * normal(random);
    return x;
}

/// The mean of neighbours over some steps either side, twice: as smooth as weather.
ArrayXd smoothed(const ArrayXd& x, Index half) {
    ArrayXd y = x;
    for (int pass = 0; pass < 2; ++pass) {
        const ArrayXd z = y;
        double sum = 0.0;
        Index low = 0, high = 0;
        for (Index i = 0; i < z.size(); ++i) {
            while (high < std::min(z.size(), i + half + 1))
                sum += z(high++);
            while (low < i - half)
                sum -= z(low++);
            y(i) = sum / static_cast<double>(high - low);
        }
    }
    return y;
}

ArrayXd stream_temperature(const Nature& nature, const ArrayXd& time_s, double dt,
                           std::mt19937_64& random) {
    const Index n = time_s.size();
    const ArrayXd weather = smoothed(wander(n, dt, 2.5 * 86400.0, random), 30);
    const ArrayXd cloud = smoothed(wander(n, dt, 1.2 * 86400.0, random), 300);
    std::uniform_real_distribution<double> trend{-0.08, 0.08};
    const double trend_K_d = trend(random);
    ArrayXd t(n);
    for (Index i = 0; i < n; ++i) {
        const double day = time_s(i) / 86400.0;
        const double angle = 2.0 * pi * (day - 15.5 / 24.0);
        t(i) = nature.stream_degC + trend_K_d * (day - time_s(0) / 86400.0) +
               nature.weather_K * weather(i) +
               nature.daily_K * std::max(0.2, 1.0 + 0.4 * cloud(i)) *
                   (std::cos(angle) + 0.18 * std::cos(2.0 * angle + 0.5));
    }
    return t;
}

ArrayXd flux_series(const Nature& nature, const ArrayXd& time_s, double dt,
                    std::mt19937_64& random) {
    const Index n = time_s.size();
    ArrayXd q = nature.base_flux_m_d +
                nature.wander_m_d * smoothed(wander(n, dt, 4.0 * 86400.0, random), 180);
    std::uniform_real_distribution<double> when{spin_up_s, time_s(n - 1) - time_s(0)};
    for (int f = 0; f < nature.floods; ++f) {
        const double at_s = time_s(0) + when(random);
        for (Index i = 0; i < n; ++i) {
            const double since = time_s(i) - at_s;
            if (since > 0.0)
                q(i) += nature.flood_m_d * (1.0 - std::exp(-since / (4.0 * 3600.0))) *
                        std::exp(-since / (1.2 * 86400.0));
        }
    }
    return q / 86400.0;
}

/// Conductivity and capacity of three layers at depths z.
struct Soil {
    ArrayXd conductivity, capacity;
};
Soil make_soil(const Nature& nature, const campaign::Bed& stated, const ArrayXd& z,
               std::mt19937_64& random) {
    std::normal_distribution<double> normal;
    std::uniform_real_distribution<double> at{0.1, 0.6};
    double first = at(random), second = at(random);
    if (first > second)
        std::swap(first, second);
    const double whole_l = nature.property_sd * normal(random);
    const double whole_c = nature.property_sd * normal(random);
    double l[3], c[3];
    for (int k = 0; k < 3; ++k) {
        l[k] =
            stated.thermal_conductivity_wmk * std::exp(whole_l + nature.layer_sd * normal(random));
        c[k] =
            stated.heat_capacity_jm3k * std::exp(whole_c + 0.6 * nature.layer_sd * normal(random));
    }
    Soil soil{z, z};
    for (Index i = 0; i < z.size(); ++i) {
        const int layer = z(i) < first ? 0 : z(i) < second ? 1 : 2;
        soil.conductivity(i) = l[layer];
        soil.capacity(i) = c[layer];
    }
    return soil;
}

} // namespace

double SimulatedBed::mean_flux_m_s(double begin_s, double end_s) const {
    double sum = 0.0, n = 0.0;
    for (Index i = 0; i < flux_m_s.size(); ++i)
        if (flux_time_s(i) >= begin_s && flux_time_s(i) < end_s) {
            sum += flux_m_s(i);
            n += 1.0;
        }
    return sum / n;
}

SimulatedBed simulate(const Nature& nature, std::mt19937_64& random) {
    const double dt = 120.0, dz = 0.004, bottom_m = 2.4;
    const auto nodes = static_cast<Index>(bottom_m / dz) + 1;
    const auto steps = static_cast<Index>((nature.days * 86400.0 + spin_up_s) / dt);
    SimulatedBed out;
    campaign::Bed& config = out.input.config;
    config.name = "rod";
    config.stretch = "rod";
    config.datum_fibre_m = 100.0;
    config.winding = campaign::Winding{0.05, 0.012};

    const ArrayXd time_s =
        start_s - spin_up_s + dt * ArrayXd::LinSpaced(steps, 0.0, static_cast<double>(steps - 1));
    const ArrayXd z = dz * ArrayXd::LinSpaced(nodes, 0.0, static_cast<double>(nodes - 1));
    const ArrayXd surface = stream_temperature(nature, time_s, dt, random);
    const ArrayXd q = flux_series(nature, time_s, dt, random);
    const Soil soil = make_soil(nature, config, z, random);

    // Channels and what each sees of the grid; above the bed is stream water.
    const double per_height = bed::fibre_per_height(config.winding);
    const double lowest_m = nature.rod_m;
    const auto channels = static_cast<Index>((lowest_m + 0.1) * per_height / nature.sample_m);
    std::uniform_real_distribution<double> shift{0.0, nature.sample_m};
    const double from_m = config.datum_fibre_m - 0.1 * per_height + shift(random);
    out.input.fibre_m =
        from_m +
        nature.sample_m * ArrayXd::LinSpaced(channels, 0.0, static_cast<double>(channels - 1));
    Eigen::MatrixXd kernel = Eigen::MatrixXd::Zero(nodes, channels);
    const double sigma = std::max(1e-4, nature.response_m / 2.3548 / per_height);
    for (Index j = 0; j < channels; ++j) {
        const double depth = (out.input.fibre_m(j) - config.datum_fibre_m) / per_height;
        double sum = 0.0;
        for (double s = -3.5; s <= 3.5001; s += 0.1) {
            const double w = std::exp(-0.5 * s * s);
            const double at =
                std::clamp((depth + s * sigma) / dz, 0.0, static_cast<double>(nodes - 1) - 1e-9);
            const auto k = static_cast<Index>(at);
            kernel(k, j) += w * (1.0 - (at - static_cast<double>(k)));
            kernel(k + 1, j) += w * (at - static_cast<double>(k));
            sum += w;
        }
        kernel.col(j) /= sum;
    }

    // Crank-Nicolson on an even fine grid; the deep end stays at the groundwater's temperature.
    std::normal_distribution<double> normal;
    const ArrayXd offset =
        nature.offset_K * ArrayXd::NullaryExpr(channels, [&](Index) { return normal(random); });
    const auto per_bin = static_cast<Index>(nature.bin_s / dt);
    const double bin_noise = nature.noise_K * std::sqrt(std::min(1.0, 600.0 / nature.bin_s));
    std::vector<Eigen::VectorXd> rows;
    std::vector<double> times;
    Eigen::VectorXd sum = Eigen::VectorXd::Zero(nodes);
    ArrayXd t = surface(0) + (nature.deep_degC - surface(0)) * (1.0 - (-z / 0.6).exp());
    ArrayXd below(nodes), at(nodes), above(nodes), right(nodes), c(nodes);
    Index in_bin = 0;
    for (Index i = 0; i + 1 < steps; ++i) {
        const double flow = water_J_m3_K * 0.5 * (q(i) + q(i + 1)) / (2.0 * dz);
        for (Index k = 1; k + 1 < nodes; ++k) {
            const double up = 2.0 / (1.0 / soil.conductivity(k - 1) + 1.0 / soil.conductivity(k));
            const double down = 2.0 / (1.0 / soil.conductivity(k) + 1.0 / soil.conductivity(k + 1));
            const double f = 0.5 * dt / soil.capacity(k);
            below(k) = f * (up / (dz * dz) + flow);
            above(k) = f * (down / (dz * dz) - flow);
            at(k) = -f * (up + down) / (dz * dz);
            right(k) = t(k) + below(k) * t(k - 1) + at(k) * t(k) + above(k) * t(k + 1);
        }
        t(0) = surface(i + 1);
        right(0) = t(0);
        c(0) = 0.0;
        for (Index k = 1; k + 1 < nodes; ++k) {
            const double pivot = 1.0 - at(k) + below(k) * c(k - 1);
            c(k) = -above(k) / pivot;
            right(k) = (right(k) + below(k) * right(k - 1)) / pivot;
        }
        for (Index k = nodes - 2; k >= 1; --k)
            t(k) = right(k) - c(k) * t(k + 1);
        if (time_s(i + 1) < start_s)
            continue;
        sum += t.matrix();
        if (++in_bin == per_bin) {
            rows.push_back(kernel.transpose() * sum / static_cast<double>(per_bin));
            times.push_back(time_s(i + 1) - 0.5 * (nature.bin_s - dt));
            sum.setZero();
            in_bin = 0;
        }
    }
    const auto n = static_cast<Index>(rows.size());
    out.input.interval_s = nature.bin_s;
    out.input.spatial_response_m = 1.0;
    out.input.time_s.resize(n);
    out.input.temperature_degC.resize(n, channels);
    const ArrayXd drift = nature.drift_K * wander(n, nature.bin_s, 86400.0, random);
    for (Index i = 0; i < n; ++i) {
        out.input.time_s(i) = times[static_cast<std::size_t>(i)];
        for (Index j = 0; j < channels; ++j)
            out.input.temperature_degC(i, j) = rows[static_cast<std::size_t>(i)](j) + offset(j) +
                                               drift(i) + bin_noise * normal(random);
    }
    out.flux_time_s = time_s;
    out.flux_m_s = q;
    return out;
}

} // namespace rillstrand::beds

// SPDX-License-Identifier: Apache-2.0
#include "weather.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace rillstrand::physics {

namespace {

/// A first-order autoregressive series of unit variance.
Eigen::ArrayXd wander(Eigen::Index n, double steps_of_memory, std::mt19937_64& random) {
    std::normal_distribution<double> normal;
    const double keep = std::exp(-1.0 / steps_of_memory);
    const double kick = std::sqrt(1.0 - keep * keep);
    Eigen::ArrayXd series(n);
    double now = normal(random);
    for (Eigen::Index i = 0; i < n; ++i) {
        now = keep * now + kick * normal(random);
        series[i] = now;
    }
    return series;
}

double sine_of_elevation(const Stream& stream, double hour) {
    const double rad = std::numbers::pi / 180.0;
    const double lat = stream.latitude_deg * rad;
    const double dec = stream.declination_deg * rad;
    return std::sin(lat) * std::sin(dec) +
           std::cos(lat) * std::cos(dec) * std::cos((hour - 12.0) * 15.0 * rad);
}

} // namespace

double solar_hour(const Stream& stream, double time_s) {
    const double hours = time_s / 3600.0 + stream.solar_offset_h;
    return hours - 24.0 * std::floor(hours / 24.0);
}

Sky make_sky(const Stream& stream, double first_s, Eigen::Index steps, std::mt19937_64& random) {
    Sky sky;
    const double per_hour = 3600.0 / stream.step_s;
    const Eigen::ArrayXd slow = wander(steps, 30.0 * per_hour, random);
    const Eigen::ArrayXd cloud =
        (stream.cloud_mean + stream.cloud_sd * wander(steps, 3.0 * per_hour, random))
            .max(0.0)
            .min(1.0);
    sky.air_degC.resize(steps);
    sky.shortwave_W_m2.resize(steps);
    sky.sky_loss_W_m2.resize(steps);
    sky.head_degC.resize(steps);
    double head = stream.source_degC;
    bool first = true;
    for (int pass = 0; pass < 2; ++pass) { // the first pass brings the headwater to its own wave
        for (Eigen::Index i = 0; i < steps; ++i) {
            const double hour = solar_hour(stream, first_s + double(i) * stream.step_s);
            const double wave = std::cos((hour - 15.0) * std::numbers::pi / 12.0);
            const double up = std::max(0.0, sine_of_elevation(stream, hour));
            sky.air_degC[i] = stream.air_mean_degC + stream.weather_K * slow[i] +
                              stream.air_amplitude_K * (1.0 - 0.5 * cloud[i]) * wave;
            sky.shortwave_W_m2[i] = 1050.0 * up * (1.0 - 0.72 * cloud[i]);
            sky.sky_loss_W_m2[i] = 70.0 * (1.0 - 0.8 * cloud[i]);
            const double heat = stream.exchange_W_m2_K * (sky.air_degC[i] - head) +
                                0.9 * stream.light * sky.shortwave_W_m2[i] -
                                stream.light * sky.sky_loss_W_m2[i];
            head += stream.step_s * (heat / (water_heat_J_m3_K * stream.head_depth_m) +
                                     (stream.source_degC - head) / (3600.0 * stream.source_hours));
            head = std::max(head, 0.0);
            sky.head_degC[i] = head;
        }
        if (first && double(steps) * stream.step_s > 5.0 * 86400.0)
            break; // long enough to forget its start within the spin-up
        first = false;
    }
    return sky;
}

} // namespace rillstrand::physics

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "bed/bed.hpp"

#include <random>

/// A streambed that is simulated on a grid much finer than any that the interpretation uses.
namespace rillstrand::beds {

/// What nature and the instrument do.
struct Nature {
    double days = 20.0;
    double base_flux_m_d = 0.3; ///< positive down
    double wander_m_d = 0.1;    ///< of the flux, over days
    int floods = 1;             ///< each adds a pulse of water downward
    double flood_m_d = 0.8;
    double daily_K = 2.5; ///< amplitude of the stream's daily wave
    double weather_K = 1.2;
    double deep_degC = 10.0;
    double stream_degC = 14.0;
    double property_sd = 0.03; ///< whole bed against stated
    double layer_sd = 0.03;    ///< layer against the whole bed
    double noise_K = 0.05;     ///< of one trace of ten minutes
    double drift_K = 0.01;     ///< slow, common to all channels
    double offset_K = 0.01;    ///< constant, a channel each
    double response_m = 1.0;   ///< full width at half maximum, along the fibre
    double sample_m = 0.25;
    double bin_s = 1800.0;
    double rod_m = 0.9;
};

struct SimulatedBed {
    bed::BedInput input;
    Eigen::ArrayXd flux_time_s, flux_m_s; ///< the truth

    double mean_flux_m_s(double begin_s, double end_s) const;
};

SimulatedBed simulate(const Nature& nature, std::mt19937_64& random);

} // namespace rillstrand::beds

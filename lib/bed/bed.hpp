// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "bed/fit.hpp"
#include "campaign/campaign.hpp"

#include <Eigen/Core>

#include <string>
#include <vector>

/// Vertical flux of water through a streambed, from the temperatures along a rod.
namespace rillstrand::bed {

/// One rod's record, averaged over equal bins of time.
struct BedInput {
    Eigen::ArrayXd time_s;            ///< UTC, middles of bins, increasing
    double interval_s = 0.0;          ///< length of a bin
    Eigen::ArrayXd fibre_m;           ///< increasing
    Eigen::ArrayXXd temperature_degC; ///< row = time, column = place; NaN where missing
    double spatial_response_m = 1.0;  ///< along the fibre
    campaign::Bed config;
};

/// Flux by one method over one window. Positive is down.
struct FluxRow {
    double time_s = 0.0;   ///< middle of the window
    double window_s = 0.0; ///< length of the window that the flux is the mean of
    std::string method;    ///< `fit`, `joint`, `amplitude`, `phase` (size only) or `steady`
    double flux_m_s = 0.0; ///< NaN where refused
    double flux_sd_m_s = 0.0;
    double diffusivity_m2_s = 0.0; ///< NaN where the method takes it as stated
    double diffusivity_sd_m2_s = 0.0;
    double upper_m = 0.0, lower_m = 0.0; ///< depths that it stands on
    std::string flag; ///< empty, or why to doubt it: one of the codes of the warnings
};

/// The daily wave at one depth over the whole record (median over windows).
struct DepthWave {
    double fibre_m = 0.0, depth_m = 0.0;
    double mean_degC = 0.0, noise_K = 0.0;
    double amplitude_K = 0.0, amplitude_sd_K = 0.0;
    double phase_rad = 0.0, phase_sd_rad = 0.0; ///< of the peak, after midnight UTC
    double second_amplitude_K = 0.0;            ///< 12 h
    double trend_K_d = 0.0;
    std::string use; ///< `fitted`, `boundary`, or why it is left out
};

struct BedFindings {
    std::string name, stretch;
    std::string method;           ///< of the series: the best that the record allows
    std::vector<FluxRow> series;  ///< a row a time by that method
    std::vector<FluxRow> methods; ///< every method, the best one first
    std::vector<DepthWave> depths;
    double mean_flux_m_s = 0.0, mean_flux_sd_m_s = 0.0; ///< over the whole series
    double diffusivity_m2_s = 0.0, diffusivity_sd_m2_s = 0.0;
    double noise_K = 0.0;
    double window_s = 0.0;           ///< of a row of the series
    double knot_s = 0.0;             ///< resolution in time of the fit
    double fibre_per_height = 1.0;   ///< of the winding
    double averaging_height_m = 0.0; ///< height that one temperature is the mean of
    Trust trust;
    std::vector<std::string> evidence;
    Warnings warnings;
};

/// @throws DataError if fewer than two depths of the stretch lie in the bed or the record is too
/// short to tell anything
BedFindings interpret(const BedInput& input);

} // namespace rillstrand::bed

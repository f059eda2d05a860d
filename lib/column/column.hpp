// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "campaign/campaign.hpp"
#include "column/hypsograph.hpp"

#include <Eigen/Core>

#include <optional>
#include <string>
#include <vector>

namespace rillstrand::column {

/// What one water column is told from.
struct ColumnInput {
    Eigen::ArrayXd time_s; ///< UTC seconds since 1970, middles of the bins
    double bin_s = 0.0;
    Eigen::ArrayXd fibre_m;           ///< of the stretch's channels, increasing
    Eigen::ArrayXXf temperature_degC; ///< row = time, column = channel; NaN where missing
    Eigen::ArrayXXf samples;          ///< traces in each mean
    /// A few hundred single traces, row = time: noise is told from their second differences.
    Eigen::ArrayXXf single_degC;
    double spatial_response_m = 1.0; ///< 10 to 90 % of a step along the fibre
    Eigen::ArrayXd level_m;          ///< elevation of the surface at time_s; empty: at the datum
    std::optional<Hypsograph> lake;
    Eigen::ArrayXd wind_ms; ///< at time_s; empty without
    campaign::Column config;
};

/// The column at one time; NaN where undefined.
struct ColumnState {
    double time_s = 0.0;
    double level_m = 0.0; ///< elevation of the surface; NaN without a level
    int channels_in_air = 0;
    double surface_c = 0.0, bottom_c = 0.0;
    double mixed_layer_depth_m = 0.0, mixed_layer_depth_sd_m = 0.0;
    double thermocline_depth_m = 0.0, thermocline_depth_sd_m = 0.0;
    double temperature_step_depth_m = 0.0; ///< of the steepest temperature
    double metalimnion_top_m = 0.0, metalimnion_bottom_m = 0.0;
    double max_gradient_cm = 0.0;      ///< steepest temperature, K/m, sign left out
    double max_density_gradient = 0.0; ///< kg m-4
    double buoyancy_frequency_max_s1 = 0.0;
    double schmidt_stability_jm2 = 0.0, schmidt_stability_sd_jm2 = 0.0;
    double heat_content_jm2 = 0.0, heat_content_sd_jm2 = 0.0;
    double lake_number = 0.0, wedderburn_number = 0.0;
    std::string stratification; ///< `stratified`, `inverse`, `mixed`, or why nothing is known
};

/// Depth of a temperature through time.
struct Isotherm {
    double time_s, temperature_c, depth_m;
};

/// A smoothed profile, thinned in time.
struct ProfilePoint {
    double time_s, depth_m, temperature_c, temperature_sd_c, elevation_m, fibre_m;
};

/// Vertical turbulent diffusivity at a depth over a part of the record.
struct Diffusivity {
    double from_s, to_s, depth_m, diffusivity_m2s, diffusivity_sd_m2s;
};

struct ColumnFindings {
    std::string name, stretch;
    std::vector<ColumnState> series;
    std::vector<Isotherm> isotherms;
    std::vector<ProfilePoint> profiles;
    std::vector<Diffusivity> diffusivity;
    double internal_wave_period_h =
        0.0;                        ///< peak of the thermocline's spectrum; NaN: none stands out
    std::vector<double> overturn_s; ///< first times of mixed water after stratified days
    std::string stability_area;     ///< what stability and heat content are per
    std::string density_source, method;
    double height_per_fibre = 1.0;
    double kernel_sd_m = 0.0;
    Warnings warnings;
};

/// Depth of each channel below the datum, m.
Eigen::ArrayXd depths_below_datum_m(const Eigen::ArrayXd& fibre_m, const campaign::Column& config);

/// Stratification of a column through time.
///
/// At every time a smooth profile with what the data leave open is fitted (ProfileFitter); each
/// figure is that of the fitted profile, its sd the spread of the same figure over profiles drawn
/// from what the data allow. A figure that fewer than half of the draws have is missing.
/// @throws DataError if no channel is ever under water, or fewer than three are
ColumnFindings interpret(const ColumnInput& input);

} // namespace rillstrand::column

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <optional>
#include <string>
#include <vector>

namespace rillstrand::quality {

/// What is known before anything is laid. What is not said leaves its rows out.
struct PlanInput {
    double noise_K = 0.1;      ///< sd of one sample of `interval_s`, at the near end
    double interval_s = 30.0;  ///< averaging time of that sample
    double average_s = 3600.0; ///< averaging time asked about
    double spacing_m = 0.5;    ///< between samples along the fibre
    double response_m = 1.0;   ///< 10-90 % spatial response
    double floor_K = 0.01;     ///< what no averaging takes away: drift, unevenness of the bed
    double reach_m = 20.0;     ///< length averaged above, and below, an inflow
    double share = 0.05;       ///< share of discharge that is to be found
    double target_sd_K = 0.05; ///< sd wanted of an adjusted temperature
    double probe_sd_K = 0.02;  ///< sd of a bath's probe
    double loss_dB_km = 0.0;   ///< one-way loss of the fibre
    double refractive_index = 1.468;
    std::optional<double> contrast_K; ///< inflow minus stream; the sign does not matter
    std::optional<double> discharge_m3s;
    std::optional<double> length_m;           ///< fibre from the instrument to its end
    std::optional<double> spot_m;             ///< width of a warm or cold patch on the bed
    std::optional<double> winding_diameter_m; ///< of the fibre's axis around the column
    std::optional<double> winding_pitch_m;    ///< height gained by one turn
};

/// One line of a plan.
struct PlanRow {
    std::string quantity;
    double value = 0.0; ///< NaN where it cannot be had, `remark` says why
    std::string unit;
    std::string formula;
    std::string source;
    std::string remark; ///< empty where there is nothing to add
};

/// sd of a mean over `average_s`, K: sqrt(noise^2 interval / average + floor^2). Never below the
/// floor; no gain is claimed for times under one interval.
/// Source: white noise falls with the root of the number of samples (any statistics text); the
/// floor is Allan's (1966), Proc. IEEE 54, 221-230, doi:10.1109/PROC.1966.4634.
double averaged_noise_K(double noise_K, double interval_s, double average_s, double floor_K);

/// Smallest share of discharge that stands three sd from none, from equal independent noise in the
/// means above and below: f = 3 sd(f), sd(f)^2 = (s / D)^2 (1 + (1 - f)^2).
/// @param side_sd_K sd of either mean
/// @return NaN where not even the whole discharge would show
/// Source: error of f = (T_below - T_above) / (T_in - T_above), Kobayashi (1985), J. Hydrol. 76,
/// 155-162, doi:10.1016/0022-1694(85)90095-6 (doi from memory); three sd: common practice.
double smallest_share(double side_sd_K, double contrast_K);

/// sd of either mean, K, at which a share is just found: the inverse of smallest_share.
double side_sd_for_share_K(double share, double contrast_K);

/// Share of a patch's true contrast at its middle, seen through a Gaussian response whose 10-90 %
/// width is given: erf(w / (2 sqrt 2 sigma)), sigma = response / 2.563103.
double seen_of_patch(double width_m, double response_m);

/// Height between samples of a helix: spacing * pitch / sqrt((pi diameter)^2 + pitch^2).
double winding_height_m(double along_m, double diameter_m, double pitch_m);

/// Least distance between two baths for an adjusted temperature at the end of the fibre to have the
/// wanted sd, the first bath at the instrument: a straight line through two baths of sd s has
/// s sqrt((1 - u)^2 + u^2) at u times their distance.
/// @return NaN where target_sd_K is under bath_sd_K / sqrt 2 (no distance is enough)
double bath_distance_m(double length_m, double bath_sd_K, double target_sd_K);

/// Fibre metres a nanosecond of two-way travel stands for: c / (2 n).
double metres_per_ns(double refractive_index);

/// Most pulses a second so that only one is in the fibre: 1 / round trip.
double highest_pulse_rate_Hz(double length_m, double refractive_index);

/// Kelvin by which a differential loss of so many dB, left in the log-ratio, spoils a temperature:
/// T^2 / gamma * dB ln(10) / 10, with gamma 482 K (usual for silica near 1064 nm, from memory).
double step_loss_error_K(double loss_dB, double temperature_degC);

/// Every line that the input allows.
/// @throws UsageError naming the first value that cannot be
std::vector<PlanRow> make_plan(const PlanInput& input);

} // namespace rillstrand::quality

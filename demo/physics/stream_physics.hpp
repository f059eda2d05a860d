// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <random>
#include <string>
#include <utility>
#include <vector>

/// A stream and a cable in it, by physics: what the tests and the demo look at. Nothing here
/// knows how the interpretation works.
namespace rillstrand::physics {

/// Water that comes in at one place of the stream.
struct PointInflow {
    std::string label;
    double stream_m = 0.0; ///< from the upstream end
    double discharge_m3s = 0.0;
    double temperature_degC = 10.0;
    double daily_amplitude_K = 0.0; ///< surface water has a daily wave
    double peak_hour = 16.0;        ///< solar time of its maximum
    double mixing_m = 0.0;          ///< e-folding length of the plume's mixing; 0: mixed at once
    double bank = 0.0; ///< where the cable lies in the plume: 0 mid-stream, -1 the far bank (sees
                       ///< nothing at first), above 0 inside the plume (1: sees twice the step)
    bool surface_water = false;
};

/// Groundwater that comes in all along a piece.
struct DiffuseGain {
    double from_m = 0.0, to_m = 0.0; ///< of the stream
    double discharge_m3s = 0.0;      ///< in all
    double temperature_degC = 10.0;
};

/// Share of the sky that a piece of the stream sees (1: open).
struct Light {
    double from_m = 0.0, to_m = 0.0;
    double share = 0.4;
};

/// A place where the cable does not tell the stream's temperature.
struct Patch {
    enum class Kind { sunlit, dry, buried, pool, spot } kind = Kind::sunlit;
    double from_m = 0.0, to_m = 0.0; ///< of the stream
    double strength = 1.0;   ///< sunlit: K per 1000 W m-2; dry, spot: share of air or seep, 0..1;
                             ///< buried, pool: time constant in hours
    double seep_degC = 10.0; ///< spots: temperature of the seep
};

/// The stream and its weather.
struct Stream {
    double length_m = 300.0;
    double cell_m = 0.5;
    double step_s = 60.0;
    double discharge_m3s = 0.04; ///< at the upstream end
    double width_m = 1.6;
    double depth_m = 0.15;
    double latitude_deg = 48.0;
    double declination_deg = 18.0;
    double solar_offset_h = 0.0; ///< solar time minus UTC
    double light = 0.5;          ///< share of sky where no Light says otherwise
    std::vector<Light> lights;
    double air_mean_degC = 18.0;
    double air_amplitude_K = 6.0;
    double weather_K = 1.5; ///< sd of slow changes of the air
    double cloud_mean = 0.35;
    double cloud_sd = 0.25;
    double exchange_W_m2_K = 25.0;
    double source_degC = 12.0;  ///< upstream groundwater that holds the headwater's mean
    double source_hours = 15.0; ///< time constant of that hold
    double head_depth_m = 0.35; ///< depth of the headwater: the slower, the smaller its wave
    std::vector<PointInflow> inflows;
    std::vector<DiffuseGain> gains;
};

/// The cable and its instrument.
struct Cable {
    double start_fibre_m = 100.0;               ///< fibre distance where the cable enters the reach
    bool against = false;                       ///< the water runs toward decreasing fibre distance
    double slack_low = 0.01, slack_high = 0.04; ///< pieces of 100 m draw theirs between
    double sampling_m = 0.5;
    double response_m = 1.0;   ///< full width at half maximum of a Gaussian
    bool box_response = false; ///< a moving mean of that width instead
    double interval_s = 600.0; ///< of one trace: its averaging time and spacing
    double noise_K = 0.08;     ///< sd of one sample at the instrument
    double noise_growth_per_km = 0.3;
    double drift_K = 0.05;                         ///< sd of slow wandering common to all channels
    double jitter_K = 0.01;                        ///< sd of an offset of each trace
    double channel_offset_K = 0.005;               ///< sd of a fixed offset of each channel
    std::vector<std::pair<double, double>> losses; ///< stream_m, K added from there on
    std::vector<std::pair<double, double>> dead;   ///< stream from, to: noise only
    std::vector<std::pair<double, double>> gaps_h; ///< hours after the start: no traces
    std::vector<Patch> patches;
};

struct TrueInflow {
    PointInflow inflow;
    double fibre_m = 0.0;
    double fraction = 0.0;         ///< of the discharge just below
    double temperature_degC = 0.0; ///< mean over the record
    Eigen::ArrayXd series_degC;    ///< at each trace
};

struct TrueGain {
    DiffuseGain gain;
    double fibre_from_m = 0.0, fibre_to_m = 0.0; ///< from < to
    double fraction = 0.0;                       ///< of the discharge at its lower end
};

struct Record {
    Eigen::ArrayXd time_s;            ///< UTC, middle of the interval
    Eigen::ArrayXd fibre_m;           ///< increasing
    Eigen::ArrayXXf temperature_degC; ///< row = trace, column = channel
    Eigen::ArrayXd air_degC, shortwave_W_m2;
    std::vector<TrueInflow> inflows; ///< in the order of the water
    std::vector<TrueGain> gains;
    double from_fibre_m = 0.0, to_fibre_m = 0.0; ///< of the reach, from < to
    double upstream_discharge_m3s = 0.0, downstream_discharge_m3s = 0.0;
    Eigen::ArrayXd slack_edges_m; ///< stream distance of slack's pieces
    Eigen::ArrayXd slack_fibre_m; ///< fibre distance there
};

/// Fibre distance of a place of the stream.
double fibre_at(const Record& record, double stream_m);

/// Runs the water and looks at it through the cable.
///
/// One-dimensional transport of heat, upwind and implicit (its numerical dispersion, u dx / 2 +
/// u^2 dt / 2, stands for the stream's), exchange with air, sun and sky at the surface with
/// shade along the reach, point and diffuse inflows, plumes that decay from one bank; then slack,
/// the spatial response, averaging, noise and what goes wrong with cables.
/// @param start_s  UTC of the first trace's beginning
Record simulate(const Stream& stream, const Cable& cable, double start_s, double days,
                std::mt19937_64& random);

} // namespace rillstrand::physics

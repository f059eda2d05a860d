// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "column/column.hpp"
#include "column/structure.hpp"

#include <random>

namespace rillstrand::simulated {

/// An invented lake and the cable in it. Water moves as a fluid does: a diffused front under a
/// mixed layer, warmed from above by day, heaved by the first vertical mode of an internal wave.
struct Lake {
    double depth_m = 16.0;
    double surface_degC = 21.0, bottom_degC = 7.0;
    double front_m = 6.0;       ///< depth of the front
    double front_sd_m = 1.2;    ///< of the diffused front
    double day_warming_K = 0.0; ///< at the surface in the afternoon
    double wave_m = 0.0, wave_period_h = 9.0;
    bool ice = false; ///< 0 degC at the surface, warmer below
    bool mixed = false;
    double level_change_m = 0.0; ///< of the surface, a sine of two days
    double air_degC = 14.0;

    double temperature_degC(double depth_m, double time_s) const;
};

struct Cable {
    double spacing_m = 0.25; ///< along the fibre
    double response_m = 1.0; ///< 10 to 90 % of a box kernel, along the fibre
    double noise_K = 0.05;   ///< of one trace
    double above_m = 1.5;    ///< height of the first channel over the datum
    std::optional<campaign::Winding> winding;
};

/// What rillstrand would be given: bins of half an hour of traces of five minutes.
column::ColumnInput observe(const Lake& lake, const Cable& cable, double days,
                            std::mt19937_64& random);

/// The lake's own profile, in steps of a centimetre, by the definitions of the figures.
column::Profile true_profile(const Lake& lake, double time_s, double bottom_m);

} // namespace rillstrand::simulated

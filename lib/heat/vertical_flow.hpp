// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "heat/ground.hpp"

/// Closed forms of conduction and advection along the vertical in uniform ground:
/// dT/dt = kappa d2T/dz2 - v dT/dz, z and v positive down, v the front's velocity.
namespace rillstrand::heat {

/// How a periodic wave at the surface goes down: T = A exp(-decay z) cos(omega t - turn z).
struct WaveNumbers {
    double decay_per_m = 0.0;
    double turn_rad_m = 0.0;
};

/// Decay and turn of a wave. With alpha = sqrt(v^4 + (8 pi kappa / P)^2):
/// a = (sqrt((alpha + v^2) / 2) - v) / (2 kappa), b = sqrt((alpha - v^2) / 2) / (2 kappa).
/// @throws DataError unless diffusivity and period are positive
/// Source: Stallman (1965), J. Geophys. Res. 70, 2821-2827, doi:10.1029/JZ070i012p02821.
WaveNumbers wave_numbers(double diffusivity_m2_s, double front_m_s, double period_s);

/// Amplitude below over amplitude above, and how much later the wave is below.
struct Damping {
    double amplitude_ratio = 1.0;
    double lag_rad = 0.0;
};

/// @param spacing_m  depth between the two places, positive
Damping damping(double diffusivity_m2_s, double front_m_s, double period_s, double spacing_m);

/// Front velocity from the amplitude ratio: v = (2 kappa / dz) ln Ar + sqrt((alpha + v^2) / 2),
/// solved for v; signed. NaN where the ratio is not positive or beyond +-20 m/d of flux's reach.
/// Source: Hatch et al. (2006), Water Resour. Res. 42, W10410, doi:10.1029/2005WR004787.
double front_from_amplitude_m_s(double diffusivity_m2_s, double period_s, double spacing_m,
                                double amplitude_ratio);

/// Size of the front velocity from the lag: |v| = sqrt(alpha - 2 (4 pi dt kappa / (P dz))^2),
/// solved for v. The lag is the same up and down: no sign. NaN where the lag is longer than
/// conduction alone gives, or not positive. Source: as above.
double front_speed_from_lag_m_s(double diffusivity_m2_s, double period_s, double spacing_m,
                                double lag_rad);

/// Front velocity and diffusivity from ratio and lag together.
struct JointFront {
    double front_m_s = 0.0; ///< signed
    double diffusivity_m2_s = 0.0;
};

/// eta = -ln Ar / lag; v = (omega dz / lag) (1 - eta^2) / (1 + eta^2);
/// kappa = omega dz^2 eta / (lag^2 (1 + eta^2)). NaN unless 0 < Ar < 1 and the lag is positive.
/// Source: Luce et al. (2013), Water Resour. Res. 49, 488-506, doi:10.1029/2012WR012380; McCallum
/// et al. (2012), Water Resour. Res. 48, W12517, doi:10.1029/2012WR012007, is the same solution.
JointFront front_from_both(double period_s, double spacing_m, Damping seen);

/// Depth between two places from ratio, lag and a known diffusivity:
/// dz = lag sqrt((kappa / omega) (eta + 1 / eta)). Source: Luce et al. (2013), as above.
double spacing_from_both_m(double diffusivity_m2_s, double period_s, Damping seen);

/// Share of the way from the temperature on top to that below, in steady state, at share x of the
/// depth: (exp(beta x) - 1) / (exp(beta) - 1), beta = C_water q L / lambda.
/// Source: Bredehoeft & Papadopulos (1965), Water Resour. Res. 1, 325-328,
/// doi:10.1029/WR001i002p00325.
double steady_share(double beta, double x);

/// q = beta lambda / (C_water L), positive down.
double flux_of_beta_m_s(double beta, double conductivity_W_m_K, double length_m);

/// Flux from one temperature between the bed's surface and deep groundwater, in steady state:
/// q = lambda / (C_water z) ln((T - T_deep) / (T_top - T_deep)), positive down; NaN unless T lies
/// between the two. Source: Schmidt et al. (2007), J. Hydrol. 347, 292-307,
/// doi:10.1016/j.jhydrol.2007.08.022 (there positive up).
double flux_above_deep_water_m_s(double conductivity_W_m_K, double depth_m, double top_degC,
                                 double at_depth_degC, double deep_degC);

} // namespace rillstrand::heat

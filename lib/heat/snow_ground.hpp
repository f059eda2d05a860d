// SPDX-License-Identifier: Apache-2.0
#pragma once

namespace rillstrand::heat {

/// Effective thermal conductivity of seasonal snow from its density rho in g cm-3.
/// k = 0.023 + 0.234 rho below 0.156; k = 0.138 - 1.01 rho + 3.233 rho^2 from 0.156 to 0.6.
/// The two differ by 0.6 % where they meet, as published.
/// @return W m-1 K-1; NaN over 600 kg m-3 or for a density that is not positive
/// Source: Sturm, Holmgren, Koenig and Morris (1997), J. Glaciol. 43, 26-41.
double snow_conductivity_W_m_K(double density_kg_m3);

/// Specific heat of ice, used for dry snow, J kg-1 K-1 (common practice).
inline constexpr double snow_heat_J_kg_K = 2100.0;

/// Depth over which a surface temperature wave falls to 1/e: d = sqrt(D P / pi), with D the thermal
/// diffusivity. The wave is late by P / (2 pi) for every d.
/// Source: Carslaw and Jaeger (1959), Conduction of Heat in Solids, 2nd ed., section 2.6.
double damping_depth_m(double diffusivity_m2_s, double period_s);

/// Damping depth of dry snow of that density for the daily wave.
double snow_damping_depth_m(double density_kg_m3);

/// Diffusivity from one wave seen at two depths, z apart: from its amplitudes
/// D = pi z^2 / (P ln(a1 / a2)^2), or from its lag D = z^2 P / (4 pi lag^2).
/// @return NaN where the deeper amplitude is not smaller, or the lag not positive
double diffusivity_from_amplitudes_m2_s(double shallow_K, double deep_K, double apart_m,
                                        double period_s);
double diffusivity_from_lag_m2_s(double lag_s, double apart_m, double period_s);

/// Depth of snow of that density that damps a daily swing to a share of what the surface has:
/// h = d ln(1 / share), in snow without end. Real snow lies on ground, which damps further, so the
/// true depth may be less for a buried cable and the snow's own surface swings otherwise than bare
/// ground: a bound with a stated density, no depth formula.
double depth_from_damping_m(double share, double density_kg_m3);

} // namespace rillstrand::heat

// SPDX-License-Identifier: Apache-2.0
#pragma once

/// Properties of ground that holds water, and the fronts that flowing water carries.
namespace rillstrand::heat {

/// Volumetric heat capacity of water near 20 degC, J m-3 K-1.
/// Source: Moene & van Dam (2014), Transport in the Atmosphere-Vegetation-Soil Continuum,
/// Cambridge University Press, table 2.2.
inline constexpr double water_heat_capacity_J_m3_K = 4.18e6;

/// Volumetric heat capacity of quartz, J m-3 K-1; the same table.
inline constexpr double quartz_heat_capacity_J_m3_K = 2.13e6;

inline constexpr double day_s = 86400.0;

/// Conducts and stores heat, as one body with the water in its pores.
struct Ground {
    double conductivity_W_m_K = 1.8;
    double heat_capacity_J_m3_K = 2.8e6;
};

/// Thermal diffusivity, conductivity over heat capacity.
/// @throws DataError unless both are positive
double diffusivity_m2_s(const Ground& ground);

/// Heat capacity of saturated ground: n C_water + (1 - n) C_solid.
/// @param porosity  share of the volume that is water, 0 to 1
/// @throws DataError if porosity is outside 0 to 1
double saturated_heat_capacity_J_m3_K(double porosity, double solid_J_m3_K);

/// Velocity of a front of temperature that a flux of water carries: q C_water / C.
/// @param flux_m_s  volume of water per area and time; the sign is kept
double front_velocity_m_s(double flux_m_s, double heat_capacity_J_m3_K);

/// The flux that carries a front of temperature so fast: v C / C_water.
double flux_of_front_m_s(double front_m_s, double heat_capacity_J_m3_K);

} // namespace rillstrand::heat

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/quantity.hpp"

namespace rillstrand::heat {

/// Standard gravity, m s-2 (exact by definition: 3rd General Conference on Weights and Measures,
/// 1901).
constexpr double standard_gravity_m_s2 = 9.80665;

/// Density of air-free water without salt at 101 325 Pa, kg m-3, 0 to 40 degC (to 0.001).
/// rho = a5 (1 - (t + a1)^2 (t + a2) / (a3 (t + a4))).
/// Source: Tanaka et al. (2001), Metrologia 38, 301-309, doi:10.1088/0026-1394/38/4/3.
double density_tanaka_kg_m3(Celsius temperature);

/// Density of natural fresh water, kg m-3, 0 to 30 degC, 0 to 0.6 g/kg, 0 to 180 bar above the
/// air's. Source: Chen and Millero (1986), Limnol. Oceanogr. 31, 657-662,
/// doi:10.4319/lo.1986.31.3.0657.
double density_chen_millero_kg_m3(Celsius temperature, double salinity_gkg, double pressure_bar);

/// Density of sea and brackish water, kg m-3, -2 to 40 degC, 0 to 42, 0 to 1000 bar (EOS-80). The
/// temperature is on the scale of 1990 and is taken to that of 1968 inside (t68 = 1.00024 t90).
/// Source: Fofonoff and Millard (1983), Unesco Technical Papers in Marine Science 44.
double density_eos80_kg_m3(Celsius temperature, double salinity, double pressure_bar);
/// Its secant bulk modulus, bar.
double bulk_modulus_eos80_bar(Celsius temperature, double salinity, double pressure_bar);

/// Density of lake water at the pressure of the air, kg m-3: Tanaka without salt, Chen and Millero
/// up to 0.6 g/kg, EOS-80 beyond. Their seams are 0.004 kg m-3 high; one column stays in one.
double lake_density_kg_m3(Celsius temperature, double salinity_gkg);

/// Name of the formula that lake_density_kg_m3 takes at this salinity.
const char* lake_density_source(double salinity_gkg);

/// Temperature of maximum density, degC.
/// Source: Chen and Millero (1986), as above.
double densest_degC(double salinity_gkg, double pressure_bar);

/// Isobaric heat capacity of water without salt at 101 325 Pa, J kg-1 K-1, -1 to 42 degC: a
/// polynomial through the values of TEOS-10.
/// Source: IOC, SCOR and IAPSO (2010), The international thermodynamic equation of seawater - 2010.
double heat_capacity_J_kgK(Celsius temperature);

/// Thermal expansion -(1/rho) d rho / d t of water without salt, K-1, from Tanaka's density.
double thermal_expansion_1_K(Celsius temperature);

/// Latent heat of vaporisation, J kg-1: 2.501e6 - 2361 t.
/// Source: Harrison (1963), as in Smith (ed., 1992), FAO Report on the expert consultation on
/// revision of methodologies for crop water requirements, Annex V.
double latent_heat_vaporisation_J_kg(Celsius temperature);

/// Latent heat of fusion at 0 degC, J kg-1. Source: TEOS-10, as above.
constexpr double latent_heat_fusion_J_kg = 333427.0;

} // namespace rillstrand::heat

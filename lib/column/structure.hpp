// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "column/hypsograph.hpp"

#include <Eigen/Core>

namespace rillstrand::column {

/// Water temperature and density by depth below the surface. Depths increase; equal neighbours
/// stand for a jump.
struct Profile {
    Eigen::ArrayXd depth_m;
    Eigen::ArrayXd temperature_degC;
    Eigen::ArrayXd density_kg_m3;
};

/// Density from temperature and salinity, see heat::lake_density_kg_m3.
Eigen::ArrayXd densities(const Eigen::ArrayXd& temperature_degC, double salinity_gkg);

/// The nearest densities that do not fall with depth (least squares, pool adjacent violators): a
/// denser layer over a lighter one is noise at the scale of hours.
/// Source: Barlow et al. (1972), Statistical inference under order restrictions.
Eigen::ArrayXd settled(const Eigen::ArrayXd& density_kg_m3);

/// Vertical scale at which gradients are told, m, and the depth from which they count.
constexpr double gradient_scale_m = 0.5;
constexpr double gradient_from_m = 1.5;
/// Least density gradient of a thermocline, kg m-4; the lesser one under inverse stratification.
constexpr double least_gradient_kg_m4 = 0.1;
constexpr double least_inverse_gradient_kg_m4 = 0.01;
/// Density over that of 0.1 to 0.4 m at which the mixed layer ends, kg m-3.
constexpr double mixed_step_kg_m3 = 0.1;

/// Where density rises fastest. All NaN where no gradient reaches the least one.
struct Thermocline {
    double depth_m;
    double gradient_kg_m4;
    double top_m, bottom_m; ///< of the metalimnion: where the gradient falls under the least one
};

/// @param profile  on an even grid from the surface whose step divides 0.25 m
/// @param inverse  water under 4 degC lies over warmer: the lesser threshold holds
Thermocline thermocline(const Profile& profile, bool inverse);

/// The same by temperature: depth of the steepest change, sign left out, and its size, K/m.
struct TemperatureStep {
    double depth_m;
    double gradient_K_m;
};
TemperatureStep steepest_temperature(const Profile& profile);

/// First depth where density is mixed_step_kg_m3 over its mean of 0.1 to 0.4 m; NaN if none.
double mixed_layer_depth_m(const Profile& profile);

/// Greatest buoyancy frequency at the same scale, s-1: N2 = g / rho d rho / dz.
double buoyancy_frequency_max_1_s(const Profile& profile);

/// Work to mix the column, over the area of its surface, J m-2:
/// S = g / A0 int (z - zv) rho(z) A(z) dz, with zv the depth of the volume's centre. Above the
/// first and below the last depth of the profile its end values hold. Source: Schmidt (1928); Idso
/// (1973), Limnol. Oceanogr. 18, 681-683, doi:10.4319/lo.1973.18.4.0681.
double schmidt_stability_J_m2(const Profile& profile, const Hypsograph& lake);

/// Heat over 0 degC, over the area of the surface, J m-2: 1 / A0 int rho cp T A dz.
double heat_content_J_m2(const Profile& profile, const Hypsograph& lake);

/// Depth of the volume's centre, m.
double volume_centre_m(const Hypsograph& lake);

/// Squared friction velocity in the water, m2 s-2: rho_air Cd U10^2 / rho, with 1.2 kg m-3 and Cd
/// of 0.0010 under 5 m/s, 0.0013 from there on.
/// Source: Hicks (1972), Bound.-Layer Meteorol. 3, 201-213, doi:10.1007/BF02033919, from memory.
double friction_velocity_squared_m2_s2(double wind_10m_ms, double density_kg_m3);

/// Wind at 10 m from wind at another height, by the logarithmic law over the roughness that belongs
/// to a drag of 0.0013 (0.15 mm).
double wind_at_10m_ms(double wind_ms, double height_m);

/// W = g' h1^2 / (u*^2 L). Source: Thompson and Imberger (1980), from memory.
/// @param upper_m  depth of the thermocline
/// @param fetch_m  the square root of the surface's area here
double wedderburn_number(double reduced_gravity_m_s2, double upper_m, double u_star2_m2_s2,
                         double fetch_m);

/// LN = S zT / (rho0 u*^2 sqrt(A0) zv), zT the depth of the thermocline.
/// Source: Imberger and Patterson (1990), Adv. Appl. Mech. 27, 303-475, from memory.
double lake_number(double stability_J_m2, double thermocline_m, double density_kg_m3,
                   double u_star2_m2_s2, const Hypsograph& lake);

} // namespace rillstrand::column

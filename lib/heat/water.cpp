// SPDX-License-Identifier: Apache-2.0
#include "heat/water.hpp"

#include <cmath>
#include <initializer_list>

namespace rillstrand::heat {

namespace {

constexpr double no_salt_gkg = 1e-9;
constexpr double limnological_gkg = 0.6;

/// Sum of c[k] x^k.
double polynomial(std::initializer_list<double> c, double x) {
    double sum = 0.0;
    for (const double* k = c.end(); k != c.begin();)
        sum = sum * x + *--k;
    return sum;
}

} // namespace

double density_tanaka_kg_m3(Celsius temperature) {
    const double t = temperature.degC();
    constexpr double a1 = -3.983035, a2 = 301.797, a3 = 522528.9, a4 = 69.34881, a5 = 999.974950;
    return a5 * (1.0 - (t + a1) * (t + a1) * (t + a2) / (a3 * (t + a4)));
}

double density_chen_millero_kg_m3(Celsius temperature, double salinity_gkg, double pressure_bar) {
    const double t = temperature.degC(), s = salinity_gkg, p = pressure_bar;
    const double fresh = polynomial(
        {0.9998395, 6.7914e-5, -9.0894e-6, 1.0171e-7, -1.2846e-9, 1.1592e-11, -5.0125e-14}, t);
    const double at_surface = 1000.0 * (fresh + polynomial({8.181e-4, -3.85e-6, 4.96e-8}, t) * s);
    const double k = polynomial({19652.17, 148.113, -2.293, 1.256e-2, -4.18e-5}, t) +
                     polynomial({3.2726, -2.147e-4, 1.128e-4}, t) * p +
                     (53.238 - 0.313 * t + 5.728e-3 * p) * s;
    return at_surface / (1.0 - p / k);
}

double bulk_modulus_eos80_bar(Celsius temperature, double salinity, double pressure_bar) {
    const double t = 1.00024 * temperature.degC(), s = salinity, p = pressure_bar;
    const double root = s * std::sqrt(s);
    const double at_surface =
        polynomial({19652.21, 148.4206, -2.327105, 1.360477e-2, -5.155288e-5}, t) +
        polynomial({54.6746, -0.603459, 1.09987e-2, -6.1670e-5}, t) * s +
        polynomial({7.944e-2, 1.6483e-2, -5.3009e-4}, t) * root;
    const double linear = polynomial({3.239908, 1.43713e-3, 1.16092e-4, -5.77905e-7}, t) +
                          polynomial({2.2838e-3, -1.0981e-5, -1.6078e-6}, t) * s +
                          1.91075e-4 * root;
    const double square = polynomial({8.50935e-5, -6.12293e-6, 5.2787e-8}, t) +
                          polynomial({-9.9348e-7, 2.0816e-8, 9.1697e-10}, t) * s;
    return at_surface + linear * p + square * p * p;
}

double density_eos80_kg_m3(Celsius temperature, double salinity, double pressure_bar) {
    const double t = 1.00024 * temperature.degC(), s = salinity;
    const double at_surface =
        polynomial({999.842594, 6.793952e-2, -9.095290e-3, 1.001685e-4, -1.120083e-6, 6.536332e-9},
                   t) +
        polynomial({8.24493e-1, -4.0899e-3, 7.6438e-5, -8.2467e-7, 5.3875e-9}, t) * s +
        polynomial({-5.72466e-3, 1.0227e-4, -1.6546e-6}, t) * s * std::sqrt(s) + 4.8314e-4 * s * s;
    return at_surface /
           (1.0 - pressure_bar / bulk_modulus_eos80_bar(temperature, salinity, pressure_bar));
}

double lake_density_kg_m3(Celsius temperature, double salinity_gkg) {
    if (salinity_gkg < no_salt_gkg)
        return density_tanaka_kg_m3(temperature);
    if (salinity_gkg <= limnological_gkg)
        return density_chen_millero_kg_m3(temperature, salinity_gkg, 0.0);
    return density_eos80_kg_m3(temperature, salinity_gkg, 0.0);
}

const char* lake_density_source(double salinity_gkg) {
    if (salinity_gkg < no_salt_gkg)
        return "Tanaka et al. (2001)";
    return salinity_gkg <= limnological_gkg ? "Chen and Millero (1986)"
                                            : "EOS-80 (Fofonoff and Millard 1983)";
}

double densest_degC(double salinity_gkg, double pressure_bar) {
    const double p = pressure_bar;
    return 3.9839 - 1.9911e-2 * p - 5.822e-6 * p * p - (0.2219 + 1.106e-4 * p) * salinity_gkg;
}

double heat_capacity_J_kgK(Celsius temperature) {
    return polynomial({4219.411535, -3.419098201, 0.1206663959, -2.401038194e-3, 2.664717043e-5,
                       -7.457653953e-8, -7.820696464e-10},
                      temperature.degC());
}

double thermal_expansion_1_K(Celsius temperature) {
    const double t = temperature.degC();
    constexpr double a1 = -3.983035, a2 = 301.797, a3 = 522528.9, a4 = 69.34881, a5 = 999.974950;
    const double u = (t + a1) * (t + a1) * (t + a2), v = a3 * (t + a4);
    const double du = 2.0 * (t + a1) * (t + a2) + (t + a1) * (t + a1);
    return a5 * (du * v - u * a3) / (v * v) / density_tanaka_kg_m3(temperature);
}

double latent_heat_vaporisation_J_kg(Celsius temperature) {
    return 2.501e6 - 2361.0 * temperature.degC();
}

} // namespace rillstrand::heat

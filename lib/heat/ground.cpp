// SPDX-License-Identifier: Apache-2.0
#include "heat/ground.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <cmath>
#include <string>

namespace rillstrand::heat {

namespace {

void need_positive(double value, const char* what) {
    if (!(value > 0.0) || !std::isfinite(value))
        throw DataError(std::string{what} + " is " + text::number(value) +
                        "; give a number above 0");
}

} // namespace

double diffusivity_m2_s(const Ground& ground) {
    need_positive(ground.conductivity_W_m_K, "the thermal conductivity");
    need_positive(ground.heat_capacity_J_m3_K, "the heat capacity");
    return ground.conductivity_W_m_K / ground.heat_capacity_J_m3_K;
}

double saturated_heat_capacity_J_m3_K(double porosity, double solid_J_m3_K) {
    if (!(porosity >= 0.0 && porosity <= 1.0))
        throw DataError("the porosity is " + text::number(porosity) + "; give a share from 0 to 1");
    return porosity * water_heat_capacity_J_m3_K + (1.0 - porosity) * solid_J_m3_K;
}

double front_velocity_m_s(double flux_m_s, double heat_capacity_J_m3_K) {
    return flux_m_s * water_heat_capacity_J_m3_K / heat_capacity_J_m3_K;
}

double flux_of_front_m_s(double front_m_s, double heat_capacity_J_m3_K) {
    return front_m_s * heat_capacity_J_m3_K / water_heat_capacity_J_m3_K;
}

} // namespace rillstrand::heat

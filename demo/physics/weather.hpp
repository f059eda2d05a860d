// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream_physics.hpp"

namespace rillstrand::physics {

/// Air and sun at every step, and the headwater that they make.
struct Sky {
    Eigen::ArrayXd air_degC;
    Eigen::ArrayXd shortwave_W_m2; ///< on open level ground
    Eigen::ArrayXd sky_loss_W_m2;  ///< longwave loss beyond the linear exchange, under an open sky
    Eigen::ArrayXd head_degC;      ///< water that enters the reach
};

/// @param first_s  UTC of the first step
Sky make_sky(const Stream& stream, double first_s, Eigen::Index steps, std::mt19937_64& random);

/// Solar time of day in hours.
double solar_hour(const Stream& stream, double time_s);

inline constexpr double water_heat_J_m3_K = 4.18e6;

} // namespace rillstrand::physics

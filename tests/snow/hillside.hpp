// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <cstdint>
#include <vector>

/// A hillside by physics: energy balance of the surface, heat conduction through snow and ground,
/// melt at 0 degC; never the estimator turned round.
namespace rillstrand::hillside {

enum class Terrain { open, ridge, gully, forest, tree_well };
enum class Season { melt_out, whole_winter, thin_and_grey };

struct Setup {
    Season season = Season::whole_winter;
    int channels = 60;
    double spacing_m = 1.0;
    double interval_s = 3600.0;
    double noise_K = 0.1;
    double bias_K = 0.0;
    double response_m = 1.0; ///< full width of the instrument's spatial response, 0: none
    double burial_depth_m = 0.0;
    double latitude_deg = 46.8;
    double longitude_deg = 9.8;
    double missing_fraction = 0.0; ///< share of whole days that are lost
    std::uint64_t seed = 1;
};

struct Hillside {
    Eigen::ArrayXd time_s; ///< UTC, middles of the intervals
    double interval_s = 0.0;
    Eigen::ArrayXd fibre_m;
    Eigen::ArrayXXf temperature_degC; ///< row = time, column = channel
    Eigen::ArrayXXf depth_m;          ///< true depth of snow, same shape
    Eigen::ArrayXd air_degC;
    Eigen::ArrayXd cloud; ///< share of the sky, 0 to 1
    std::vector<Terrain> terrain;
    double grey_from_s = 0.0, grey_to_s = 0.0; ///< of Season::thin_and_grey
};

Hillside make_hillside(const Setup& setup);

/// Depth from which a place counts as covered.
inline constexpr double covered_from_m = 0.01;

} // namespace rillstrand::hillside

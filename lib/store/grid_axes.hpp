// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "store/gdal_grid.hpp"

/// Axes and units of a grid by the CF conventions; included by sources of this room only.
namespace rillstrand::store {

struct GridAxes {
    bool time_first = true;    ///< the stored order of the dimensions is (time, distance)
    Eigen::ArrayXd time_s;     ///< UTC as stamped
    Eigen::ArrayXd distance_m; ///< as stored: may fall
};

/// The variable that the campaign names.
/// @throws DataError naming those there are
Array find_variable(const GdalGrid& grid, const std::string& name, const std::string& key);

/// @throws DataError if the dimensions are not one of time and one of distance, or their units say
///         otherwise than the campaign
GridAxes read_axes(const GdalGrid& grid, const Array& variable, const campaign::Record& record);

/// Unit of the temperature: the file's own, or the campaign's where the file says none.
/// @throws DataError if the two differ
campaign::TemperatureUnit temperature_unit(const GdalGrid& grid, const Array& variable,
                                           const campaign::Record& record);

} // namespace rillstrand::store

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "crs.hpp"

#include <filesystem>

namespace rillstrand::geo {

struct RasterSamples {
    Eigen::ArrayXd value;                 ///< bilinear; NaN outside the raster or beside nodata
    Eigen::ArrayXd slope_deg, aspect_deg; ///< empty unless asked for
    Eigen::Index outside = 0;
};

/// Samples a local raster at points. Bilinear between cell centres where all four have data, the
/// cell's own value at the raster's rim. Slope and aspect are of the plane through the eight
/// neighbours. Source: Horn (1981), Proc. IEEE 69, 14-47, doi:10.1109/PROC.1981.11918.
/// @param key  names where the file was said
/// @throws DataError if it cannot be read or has no coordinate system
RasterSamples sample_raster(const std::filesystem::path& file, const PointsXY& lonlat,
                            bool with_slope, const std::string& key);

} // namespace rillstrand::geo

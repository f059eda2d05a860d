// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"

#include <filesystem>
#include <string>
#include <vector>

namespace rillstrand::geo {

/// One value a channel along the cable, to be painted a few metres either side of it.
struct Corridor {
    std::string title; ///< e.g. `Mean temperature`
    std::string unit;  ///< e.g. `degC`; empty where there is none
    std::string crs;   ///< of x, y: EPSG code or WKT
    std::vector<double>
        x; ///< easting or longitude of the channels in fibre order, NaN: no position
    std::vector<double> y;     ///< size of x
    std::vector<double> value; ///< size of x; NaN: missing, left blank
    double corridor_m = 5.0;   ///< half width
    double max_gap_m = 50.0;   ///< neighbours further apart are not joined
    std::string now;           ///< time of the run, `YYYY-MM-DDThh:mm:ssZ`
};

struct CorridorRaster {
    int width = 0;
    int height = 0;
    double resolution_m = 0.0;
    Warnings warnings;
};

/// Writes a Cloud Optimized GeoTIFF (float32, nodata NaN): every cell within corridor_m of the
/// cable has the value of the nearest channel, every other cell is blank; there is no smoothing,
/// since the cable says nothing of the ground beside it. Cells are as wide as half the channels'
/// median spacing, but no less than corridor/20 and no more than corridor/2; they are coarsened,
/// with a warning, where the raster would have more than 50 million of them. Where x, y are
/// degrees the raster is in the cable's UTM zone.
///
/// @throws DataError if the coordinate system is unknown or no channel has a position
/// @throws MachineError if the file cannot be written
CorridorRaster write_corridor(const Corridor& corridor, const std::filesystem::path& file);

} // namespace rillstrand::geo

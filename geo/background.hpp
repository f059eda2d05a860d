// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <array>
#include <cstddef>
#include <filesystem>
#include <vector>

namespace rillstrand::geo {

/// A picture to lay under the page's map.
struct Background {
    /// WebP (media type image/webp) with opacity, rows evenly spaced in spherical Mercator
    /// (EPSG:3857).
    std::vector<std::byte> webp;
    int width = 0;
    int height = 0;
    double west = 0.0, south = 0.0, east = 0.0, north = 0.0; ///< edges, degrees WGS 84
};

/// Warps a local georeferenced picture (GeoTIFF, PNG, JPEG, JPEG 2000 with a coordinate system) to
/// spherical Mercator, cut to the part around the cable. Three bands or more: the first three are
/// red, green and blue; one: grey, or its colour table. Values of more than 8 bits are stretched to
/// the range of the part that is shown.
///
/// @param file        only the drivers named above are tried; nothing is fetched
/// @param around      west, south, east, north of what the map shows, degrees WGS 84
/// @param max_pixels  the picture's longer side at most
/// @throws DataError if it cannot be read, has no coordinate system, or lies elsewhere
Background warp_background(const std::filesystem::path& file, const std::array<double, 4>& around,
                           int max_pixels = 2048);

} // namespace rillstrand::geo

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "layers.hpp"
#include "style.hpp"

#include <filesystem>
#include <functional>
#include <initializer_list>
#include <string>
#include <string_view>
#include <vector>

/// Between layers.cpp and the writer of each format; not for other rooms.
namespace rillstrand::geo::writing {

/// A layer with its name as it stands in files.
struct Named {
    const Layer* layer = nullptr;
    std::string name;
    Look look; ///< complete
    /// As layer->vertices in WGS 84 longitude, latitude, height; only where a format asked for it.
    std::vector<std::vector<Eigen::Vector3d>> lon_lat;

    const Table& table() const { return layer->table; }
    bool has_geometry() const { return layer->geometry != GeometryKind::none; }
};

struct Job {
    const LayerSet* set = nullptr;
    std::vector<Named> layers;
    std::filesystem::path folder;
};

/// The vertices that make a geometry, or none where it is missing: every x and y finite, and two
/// vertices at least for a line.
bool is_missing(const Layer& layer, const std::vector<Eigen::Vector3d>& vertices);

/// Any height that is unknown in a layer with heights.
bool has_unknown_height(const Layer& layer);

/// A text file written, closed and checked.
/// @throws MachineError naming it
void write_text(const std::filesystem::path& file, std::string text);

/// A text file written piece by piece: more than fits in memory at once is no trouble.
/// @param fill  called with a function that takes the next piece
void write_pieces(const std::filesystem::path& file,
                  const std::function<void(const std::function<void(std::string&)>&)>& fill);

/// The pieces one after the other.
std::string joined(std::initializer_list<std::string_view> pieces);

/// Well-formed UTF-8: every byte that is none becomes the replacement character.
std::string utf8(std::string_view text);

/// Text for XML: the five characters escaped, control characters that XML forbids left out.
std::string xml(std::string_view text);

/// Text as a JSON string, with its quotes.
std::string json(std::string_view text);

/// Tells once which tables a format of places cannot hold.
void warn_of_tables(const Job& job, const std::string& file, WrittenLayers& written);

void write_gpkg(const Job& job, WrittenLayers& written);
void write_geojson(const Job& job, WrittenLayers& written);
void write_flatgeobuf(const Job& job, WrittenLayers& written);
void write_kml(const Job& job, WrittenLayers& written);
void write_gpx(const Job& job, WrittenLayers& written);
void write_shapefile(const Job& job, WrittenLayers& written);
void write_csv(const Job& job, WrittenLayers& written);

} // namespace rillstrand::geo::writing

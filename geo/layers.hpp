// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "base/table.hpp"
#include "campaign/campaign.hpp"

#include <Eigen/Core>

#include <filesystem>
#include <string>
#include <vector>

/// Findings as layers for GIS programs.
namespace rillstrand::geo {

enum class GeometryKind { none, point, point_z, line_string_z };

/// How a layer is best looked at. Names are columns of the layer's table; empty: told from the
/// layer's name and columns (see complete_look in style.hpp), a name without a column is ignored.
struct Look {
    std::string colour_by;  ///< real column: classes of colour; text column: a colour a value
    std::string halo_by;    ///< real column of standard deviations: the larger, the wider the halo
    std::string time_by;    ///< time or date column that a temporal player follows
    std::string label_by;   ///< name of a waypoint or placemark
    bool diverging = false; ///< colours diverge from zero (anomalies) instead of running up
    bool waypoints = false; ///< a layer of findings that goes into the GPX file
};

/// A table and a geometry for each of its rows.
struct Layer {
    Table table;
    GeometryKind geometry = GeometryKind::none;
    /// One row's vertices each, x (east or longitude), y, z in the set's coordinate system; size
    /// table.rows() (empty where geometry is none). A point has one vertex, a line two or more.
    /// NaN in x or y, or no vertex, is a missing geometry (NULL); NaN in z is an unknown height.
    std::vector<std::vector<Eigen::Vector3d>> vertices;
    Look look;
};

/// A table without geometry.
Layer table_layer(Table table);
/// A layer of points, positions given apart; sizes are those of the table.
/// @param kind  point or point_z; z is not read for point and may be empty (unknown heights)
Layer point_layer(Table table, GeometryKind kind, const std::vector<double>& x,
                  const std::vector<double>& y, const std::vector<double>& z = {});

/// A spatial view: the rows of a table without geometry on the points of a layer, by time, so that
/// a temporal player of a GIS program can run through them. Written to the GeoPackage only, and
/// only where both layers are there and the second one has positions.
///
/// Snow: table `snow_daily`, points `snow_channels`, key `fibre_m`, no place. A column: table
/// `column_mast`, points a layer with a row a column, key the column of its names, place the name.
struct TimeView {
    std::string name; ///< of the view, e.g. `snow_daily_map`; no layer has it
    std::string title;
    std::string table;   ///< a layer without geometry
    std::string points;  ///< a point layer
    std::string key;     ///< column that tells one point; the table has it too, but for `place`
    Look look;           ///< names of columns of `table`
    std::string place{}; ///< where every row of the table belongs to one point: its value of `key`
};

/// All that a campaign hands to a GIS program.
struct LayerSet {
    std::string crs; ///< of x and y: EPSG code (`EPSG:25832`) or WKT; empty: no layer has geometry
    std::string title;
    std::string summary;
    std::string creator, institution, licence;
    std::vector<std::string> keywords;
    std::string provenance; ///< text: version, inputs and their sums, defaults used
    std::string now;        ///< time of the run, `YYYY-MM-DDThh:mm:ssZ`: rooms read no clock
    std::vector<Layer> layers;
    std::vector<TimeView> views;
};

struct WrittenLayers {
    std::vector<std::filesystem::path> files; ///< relative to the folder, sorted
    Warnings warnings;                        ///< what a format could not hold
};

/// Writes a set of layers in the formats asked for.
///
/// gpkg: `layers.gpkg` with all layers (tables as attributes), titles and units of fields, metadata
/// with provenance, spatial index, time views and styles, and the styles again as
/// `layers/<layer>.sld`. geojson, flatgeobuf, shapefile, csv: `layers/<layer>.geojson`, `.fgb`,
/// `.shp.zip` (with a table of its short names), `.csv` (geometry as WKT). kml: `layers.kml`, a
/// folder a layer. gpx: `findings.gpx`. GeoJSON, KML and GPX are in WGS 84 longitude and latitude:
/// the table's `lon` and `lat` where it has them, else transformed.
/// Names of layers are brought to the form of text::slug. Missing values are NULL, times UTC.
///
/// @param folder  exists; earlier files of the same names are replaced, nothing else is touched
/// @throws DataError if the coordinate system or a layer cannot be used (two layers of one name,
///         sizes that differ)
/// @throws MachineError if a file cannot be written, naming it, with the library's text
WrittenLayers write_layers(const LayerSet& set, const std::vector<campaign::LayerFormat>& formats,
                           const std::filesystem::path& folder);

} // namespace rillstrand::geo

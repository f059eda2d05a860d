// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <array>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

/// The campaign file as plain structs: every key, with its unit in its name. Any room may use
/// these; only the sources of this room know TOML.
namespace rillstrand::campaign {

/// Where in the campaign file something was said; `line` 0: not said, a default.
struct Where {
    int line = 0;
    int column = 0;
};

/// A column of a delimited text file with a `time` column.
struct SideSeries {
    std::filesystem::path file; ///< absolute
    std::string column;
    Where where;
};

enum class Layout { told_from_file, wide, tall, single, grid };
enum class Stamp { start, middle, end };
enum class Duplicates { refuse, first, mean };
enum class Align { refuse, nearest, linear };
enum class TemperatureUnit { degC, kelvin, degF };
enum class DistanceUnit { metre, kilometre, foot };

struct RecordText {
    std::optional<char> delimiter; ///< absent: told from the file; ' ' means runs of blanks
    std::optional<char> decimal;   ///< '.' or ','
    std::string comment = "#";
    int skip_lines = 0;
    std::string time_column = "time";
    std::string distance_column = "distance";
    std::string temperature_column = "temperature";
    std::optional<std::string> time_format; ///< strftime-like, where stamps are not ISO 8601
    std::optional<std::string> time_from_name;
    std::optional<std::string> time_from_header;
    std::optional<std::string> stokes_column, antistokes_column, reverse_stokes_column,
        reverse_antistokes_column;
};

struct RecordGrid {
    std::string variable = "temperature";
    std::optional<std::string> stokes, antistokes, reverse_stokes, reverse_antistokes;
};

struct Record {
    std::vector<std::string> files; ///< patterns as written, relative to the campaign's folder
    Layout layout = Layout::told_from_file;
    std::string time_zone = "Etc/UTC";
    double clock_offset_s = 0.0;
    Stamp stamp = Stamp::middle;
    std::optional<double> interval_s;
    Duplicates duplicates = Duplicates::refuse;
    Align align = Align::refuse;
    TemperatureUnit temperature_unit = TemperatureUnit::degC;
    bool temperature_unit_said = false;
    DistanceUnit distance_unit = DistanceUnit::metre;
    bool distance_unit_said = false;
    std::vector<std::string> missing{"", "nan", "NA", "-9999"};
    std::array<double, 2> valid_range_c{-80.0, 120.0};
    RecordText text;
    RecordGrid grid;
    Where where;
};

enum class Setting { streambed, ground, water, air, coil, bath };

struct Stretch {
    std::string name;
    Setting setting = Setting::ground;
    double from_m = 0.0; ///< fibre distance; from_m < to_m
    double to_m = 0.0;
    double burial_depth_m = 0.0;
    Where where;
};

enum class BathUse { adjust, validate };

struct Bath {
    std::string name;
    double from_m = 0.0;
    double to_m = 0.0;
    std::optional<double> temperature_c; ///< exactly one of temperature_c and probe
    std::optional<SideSeries> probe;
    double temperature_sd_c = 0.0; ///< see temperature_sd_said
    bool temperature_sd_said = false;
    BathUse use = BathUse::adjust; ///< default: validate where [adjust] is absent
    Where where;
};

enum class AdjustMethod { offset, offset_and_slope, raman };

struct Adjust {
    AdjustMethod method = AdjustMethod::offset;
    Where where;
};

struct NamedRaster {
    std::string name;
    std::filesystem::path file;
    Where where;
};

struct PlacementControl {
    std::string crs;
    std::filesystem::path points;
    Where where;
};

struct Placement {
    std::string crs; ///< EPSG code, WKT, or "local"
    std::filesystem::path tie_points;
    std::optional<std::filesystem::path> cable_marks, route, river, elevation;
    std::optional<double> turnaround_m;
    std::optional<std::string> output_crs;
    std::vector<NamedRaster> raster;
    double max_slack = 1.12;
    std::optional<PlacementControl> control;
    Where where;
};

enum class MarkKind { cold, warm };

struct Mark {
    std::string label;
    MarkKind kind = MarkKind::cold;
    double begin_s = 0.0; ///< UTC seconds since 1970-01-01
    double end_s = 0.0;
    double near_m = 0.0;
    double within_m = 0.0;
    double x = 0.0, y = 0.0;
    std::optional<double> z;
    std::optional<double> sd_m;
    Where where;
};

enum class Flow { increasing, decreasing };
enum class DischargeAt { upstream, downstream };

struct Gauging {
    double fibre_m = 0.0;
    double discharge_m3s = 0.0;
    double discharge_sd_m3s = 0.0;
    bool sd_said = false;
    Where where;
};

struct Weather {
    std::filesystem::path file;
    std::optional<std::string> air_temperature, relative_humidity, wind_speed, shortwave;
    Where where;
};

struct Regime {
    std::vector<double> hours_above_c;
    std::optional<double> refuge_colder_by_c;
};

struct KnownInflow {
    std::string label;
    double fibre_m = 0.0;
    std::optional<SideSeries> temperature; ///< at most one of the two
    std::optional<std::string> temperature_stretch;
    Where where;
};

struct Stream {
    std::string stretch;
    Flow flow = Flow::increasing;
    std::optional<double> inflow_temperature_c; ///< at most one of constant and series
    std::optional<double> inflow_temperature_sd_c;
    std::optional<SideSeries> inflow_temperature;
    DischargeAt discharge_at = DischargeAt::upstream;
    std::optional<double> discharge_m3s; ///< at most one of constant and series
    std::optional<double> discharge_sd_m3s;
    std::optional<SideSeries> discharge;
    std::vector<Gauging> gauging;
    std::optional<Weather> weather;
    Regime regime;
    std::vector<KnownInflow> known;
    Where where;
};

enum class SnowMethod { model, threshold };

struct Snow {
    std::string stretch;
    std::optional<double> utc_offset_h;
    std::optional<SideSeries> air;
    SnowMethod method = SnowMethod::model;
    std::optional<double> swing_below_c, mean_below_c; ///< all three said with `threshold`
    std::optional<double> minimum_days;
    Where where;
};

struct Winding {
    double diameter_m = 0.0; ///< to the fibre's centre line
    double pitch_m = 0.0;    ///< height of one turn
};

enum class Direction { down, up };

struct Column {
    std::string name;
    std::string stretch;
    double datum_fibre_m = 0.0;
    std::optional<double> datum_elevation_m;
    Direction direction = Direction::down;
    std::optional<Winding> winding;
    std::optional<std::array<double, 2>> position; ///< x, y in the placement's crs
    std::optional<double> water_level_m;           ///< elevation; at most one of the two
    std::optional<SideSeries> water_level;
    std::optional<std::filesystem::path> hypsograph;
    std::optional<SideSeries> wind;
    double wind_height_m = 10.0; ///< of the anemometer over the water
    double salinity_gkg = 0.0;
    Where where;
};

struct Bed {
    std::string name;
    std::string stretch;
    double datum_fibre_m = 0.0;
    Direction direction = Direction::down;
    std::optional<Winding> winding;
    std::optional<std::array<double, 2>> position;
    std::optional<double> datum_elevation_m;
    double thermal_conductivity_wmk = 1.8;
    double heat_capacity_jm3k = 2.8e6;
    double porosity = 0.3;
    Where where;
};

enum class LayerFormat { gpkg, geojson, flatgeobuf, kml, gpx, shapefile, csv };

struct Layers {
    std::vector<LayerFormat> formats{LayerFormat::gpkg, LayerFormat::geojson};
    std::optional<double> corridor_m;
};

/// One campaign. Every path is absolute; every number is in its key's unit and inside its range.
struct Campaign {
    std::filesystem::path file;   ///< the campaign file itself
    std::filesystem::path folder; ///< of the campaign file; relative paths start here
    std::string name;
    std::filesystem::path output;
    std::string summary, creator, institution, licence;
    std::vector<std::string> keywords;
    Record record;
    std::vector<Stretch> stretches;
    std::vector<Bath> baths;
    std::optional<Adjust> adjust;
    std::optional<Placement> placement;
    std::vector<Mark> marks;
    std::vector<Stream> streams;
    std::vector<Snow> snows;
    std::vector<Column> columns;
    std::vector<Bed> beds;
    Layers layers;
    std::optional<std::filesystem::path> page_background;
    /// Every default that was used: key path and value as text, for provenance.
    std::vector<std::array<std::string, 2>> defaults;

    /// @return the stretch of that name, or nullptr
    const Stretch* find_stretch(const std::string& stretch_name) const;
    /// @return `campaign.toml:12:1`, the way problems name a place in the file
    std::string place(Where where) const;
};

} // namespace rillstrand::campaign

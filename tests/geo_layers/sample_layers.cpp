// SPDX-License-Identifier: Apache-2.0
#include "geo_layers/sample_layers.hpp"

#include <limits>

namespace rillstrand::geo::sample {

namespace {
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

Layer channels() {
    Table table{"channels", "Channels"};
    table.add_real("fibre_m", "fibre distance", "m", {100.0, 101.015, 102.03}, 3);
    table.add_text("stretch", "stretch", {hostile, "reach", ""});
    table.add_real("mean_c", "mean temperature", "degC", {9.123456789, nan, -0.25});
    table.add_real("position_sd_m", "standard deviation of the position", "m", {0.4, nan, 1.25});
    table.add_integer("samples", "number of samples", {17280, 0, 9007199254740993});
    table.add_boolean("flag", "to be looked at", {true, false, false});
    table.add_time("first", "first trace", {1932786428.0, nan, 1932786428.25});
    table.add_date("melt_out", "first day without snow", {"2031-04-05", "", "2032-02-29"});
    return point_layer(std::move(table), GeometryKind::point_z, {512345.1234, nan, 512349.5},
                       {5278120.4321, nan, 5278121.75}, {612.125, nan, nan});
}

Layer cable() {
    Table table{"cable", "Cable"};
    table.add_text("stretch", "stretch", {"reach", "gone"});
    table.add_real("slack", "fibre metres per ground metre", "1", {1.0125, nan});
    Layer layer{std::move(table), GeometryKind::line_string_z, {}, {}};
    layer.vertices = {{{512345.0, 5278120.0, 612.0}, {512355.5, 5278130.25, 611.5}}, {}};
    return layer;
}

Layer inflows() {
    Table table{"inflows", "Inflows"};
    table.add_real("fibre_m", "fibre distance", "m", {101.0}, 1);
    table.add_text("kind", "kind", {"step"});
    table.add_real("fraction", "share of discharge", "1", {0.125});
    table.add_real("fraction_sd", "its standard deviation", "1", {0.02});
    return point_layer(std::move(table), GeometryKind::point, {512346.0}, {5278121.0});
}

Layer snow_channels() {
    Table table{"snow_channels", "Snow by channel"};
    table.add_real("fibre_m", "fibre distance", "m", {100.0, 102.03});
    table.add_real("covered_days", "days with snow", "d", {97.0, 101.0});
    return point_layer(std::move(table), GeometryKind::point, {512345.1234, 512349.5},
                       {5278120.4321, 5278121.75});
}

Layer snow_daily() {
    Table table{"snow_daily", "Snow by day"};
    table.add_real("fibre_m", "fibre distance", "m", {100.0, 102.03, 100.0, 102.03});
    table.add_date("date", "day", {"2031-04-05", "2031-04-05", "2031-04-06", "2031-04-06"});
    table.add_text("state", "state", {"snow", "bare", "bare", "unknown"});
    table.add_real("probability", "probability of snow", "1", {0.98, 0.01, 0.2, nan});
    return table_layer(std::move(table));
}

Layer column() {
    Table table{"column_Mast A", "Column at Mast A"};
    table.add_time("time", "time", {1932786428.0, 1932790028.5});
    table.add_real("thermocline_depth_m", "thermocline depth", "m", {5.57, nan});
    return table_layer(std::move(table));
}
} // namespace

namespace {
Layer masts() {
    Table table{"columns"};
    table.add_text("name", "name of the column", {"Mast A", "Mast B"});
    return point_layer(std::move(table), GeometryKind::point, {512400.0, 512500.0},
                       {5278000.0, 5278100.0});
}
} // namespace

LayerSet layer_set() {
    LayerSet set;
    set.crs = "EPSG:25832";
    set.title = std::string{"Upper Harrowbeck "} + hostile;
    set.summary = "Summer low flow & snow";
    set.creator = "The Harrowbeck Party";
    set.licence = "CC0-1.0";
    set.keywords = {"stream temperature", "fibre <optics>"};
    set.provenance = "rillstrand; campaign.toml 0123'abc";
    set.now = "2031-07-01T12:00:00Z";
    set.layers = {channels(), cable(), inflows(), snow_channels(), snow_daily(), column(), masts()};
    set.views = {
        {"snow_daily_map",
         "Snow by day and channel",
         "snow_daily",
         "snow_channels",
         "fibre_m",
         {"state", "", "date", "", false, false},
         ""},
        {"column_mast_a_map", "Column in time", "column_Mast A", "columns", "name", {}, "Mast A"}};
    return set;
}

std::filesystem::path fresh_folder(const std::string& name) {
    const auto folder = std::filesystem::path{RILLSTRAND_SCRATCH} / name;
    std::filesystem::remove_all(folder);
    std::filesystem::create_directories(folder);
    return folder;
}

} // namespace rillstrand::geo::sample

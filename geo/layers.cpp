// SPDX-License-Identifier: Apache-2.0
#include "layers.hpp"

#include "base/text.hpp"
#include "layers_gdal.hpp"
#include "layers_write.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <memory>
#include <set>
#include <system_error>

namespace rillstrand::geo {

Layer table_layer(Table table) {
    return {std::move(table), GeometryKind::none, {}, {}};
}

Layer point_layer(Table table, GeometryKind kind, const std::vector<double>& x,
                  const std::vector<double>& y, const std::vector<double>& z) {
    Layer layer{std::move(table), kind, {}, {}};
    layer.vertices.reserve(x.size());
    for (std::size_t i = 0; i < x.size(); ++i) {
        const double height = z.empty() ? std::numeric_limits<double>::quiet_NaN() : z.at(i);
        layer.vertices.push_back({Eigen::Vector3d{x[i], y.at(i), height}});
    }
    return layer;
}

namespace writing {

bool is_missing(const Layer& layer, const std::vector<Eigen::Vector3d>& vertices) {
    const std::size_t needed = layer.geometry == GeometryKind::line_string_z ? 2 : 1;
    if (vertices.size() < needed)
        return true;
    return std::any_of(vertices.begin(), vertices.end(), [](const Eigen::Vector3d& v) {
        return !std::isfinite(v.x()) || !std::isfinite(v.y());
    });
}

void warn_of_tables(const Job& job, const std::string& file, WrittenLayers& written) {
    std::string names;
    for (const auto& named : job.layers)
        if (!named.has_geometry())
            names += (names.empty() ? "" : ", ") + named.name;
    if (!names.empty())
        written.warnings.push_back(
            {"layers-without-place", file + ": the format holds no tables without positions (" +
                                         names + "); take them from the folder tables"});
}

bool has_unknown_height(const Layer& layer) {
    for (const auto& row : layer.vertices)
        if (!is_missing(layer, row))
            for (const auto& v : row)
                if (!std::isfinite(v.z()))
                    return true;
    return false;
}

namespace {
std::string file_name(const std::string& name) {
    std::string slug = text::slug(name);
    if (slug.empty() || slug == "_")
        slug = "layer";
    // Names that a GeoPackage keeps for itself.
    for (const char* prefix : {"gpkg_", "rtree_", "sqlite_"})
        if (slug.rfind(prefix, 0) == 0)
            return "layer_" + slug;
    return slug == "layer_styles" ? "layer_styles_data" : slug;
}

void check_columns(const Layer& layer, const std::string& name, Problems& problems) {
    std::set<std::string> seen;
    for (const auto& column : layer.table.columns()) {
        if (!seen.insert(text::slug(column.name)).second)
            problems.add("layer " + name + ": two columns are named " + column.name +
                         "; rename one of them (a raster of [placement], say)");
        if (column.size() != layer.table.rows())
            problems.add("layer " + name + ": column " + column.name + " has " +
                         std::to_string(column.size()) + " rows, the table " +
                         std::to_string(layer.table.rows()) + "; give every column all rows");
    }
    if (layer.geometry != GeometryKind::none && layer.vertices.size() != layer.table.rows())
        problems.add("layer " + name + ": " + std::to_string(layer.vertices.size()) +
                     " geometries for " + std::to_string(layer.table.rows()) +
                     " rows; give one a row");
}

std::vector<Named> named_layers(const LayerSet& set) {
    std::vector<Named> list;
    std::set<std::string> names;
    Problems problems;
    for (const auto& layer : set.layers) {
        Named named{&layer, file_name(layer.table.name()), complete_look(layer), {}};
        if (!names.insert(named.name).second)
            problems.add("two layers are named " + named.name +
                         "; give the columns or beds names that differ in letters or digits");
        check_columns(layer, named.name, problems);
        if (named.has_geometry() && set.crs.empty())
            problems.add("layer " + named.name +
                         " has positions but no coordinate system; give crs in [placement]");
        list.push_back(std::move(named));
    }
    for (const auto& view : set.views)
        if (!names.insert(text::slug(view.name)).second)
            problems.add("a view is named like a layer or another view: " + text::slug(view.name) +
                         "; give it another name");
    problems.throw_if_any();
    return list;
}

void take_lon_lat_columns(Named& named, const Column& lon, const Column& lat) {
    named.lon_lat = named.layer->vertices;
    for (std::size_t i = 0; i < named.lon_lat.size(); ++i)
        for (auto& v : named.lon_lat[i]) {
            v.x() = lon.real[i];
            v.y() = lat.real[i];
        }
}

void transform(Named& named, OGRCoordinateTransformation& to_wgs84) {
    named.lon_lat = named.layer->vertices;
    std::vector<double> x, y;
    for (auto& row : named.lon_lat) {
        x.clear();
        y.clear();
        for (const auto& v : row) {
            x.push_back(v.x());
            y.push_back(v.y());
        }
        if (is_missing(*named.layer, row))
            continue;
        std::vector<int> good(x.size());
        to_wgs84.Transform(static_cast<int>(x.size()), x.data(), y.data(), nullptr, nullptr,
                           good.data());
        for (std::size_t i = 0; i < row.size(); ++i) {
            const double nan = std::numeric_limits<double>::quiet_NaN();
            row[i].x() = good[i] != 0 ? x[i] : nan;
            row[i].y() = good[i] != 0 ? y[i] : nan;
        }
    }
}

void add_lon_lat(Job& job) {
    if (job.set->crs.empty())
        return;
    const GdalFailures failures; // a position outside the system's use becomes a missing one
    OGRSpatialReference from = coordinate_system(job.set->crs);
    from.StripVertical(); // heights stay as they are
    const OGRSpatialReference to = wgs84();
    const std::unique_ptr<OGRCoordinateTransformation> to_wgs84{
        OGRCreateCoordinateTransformation(&from, &to)};
    if (!to_wgs84)
        throw DataError{"coordinate system '" + job.set->crs + "' cannot be brought to WGS 84 (" +
                        failures.text() + "); give one that has a datum"};
    for (auto& named : job.layers) {
        if (!named.has_geometry())
            continue;
        const Column* lon = named.table().find("lon");
        const Column* lat = named.table().find("lat");
        const bool points = named.layer->geometry != GeometryKind::line_string_z;
        if (points && lon != nullptr && lat != nullptr && lon->kind == ColumnKind::real &&
            lat->kind == ColumnKind::real)
            take_lon_lat_columns(named, *lon, *lat);
        else
            transform(named, *to_wgs84);
    }
}

bool needs_lon_lat(campaign::LayerFormat format) {
    return format == campaign::LayerFormat::geojson || format == campaign::LayerFormat::kml ||
           format == campaign::LayerFormat::gpx;
}

void write_format(const Job& job, campaign::LayerFormat format, WrittenLayers& written) {
    switch (format) {
    case campaign::LayerFormat::gpkg:
        return write_gpkg(job, written);
    case campaign::LayerFormat::geojson:
        return write_geojson(job, written);
    case campaign::LayerFormat::flatgeobuf:
        return write_flatgeobuf(job, written);
    case campaign::LayerFormat::kml:
        return write_kml(job, written);
    case campaign::LayerFormat::gpx:
        return write_gpx(job, written);
    case campaign::LayerFormat::shapefile:
        return write_shapefile(job, written);
    case campaign::LayerFormat::csv:
        return write_csv(job, written);
    }
}
} // namespace
} // namespace writing

WrittenLayers write_layers(const LayerSet& set, const std::vector<campaign::LayerFormat>& formats,
                           const std::filesystem::path& folder) {
    writing::Job job{&set, writing::named_layers(set), folder};
    if (!set.crs.empty())
        (void)coordinate_system(set.crs); // refused before anything is written
    if (std::any_of(formats.begin(), formats.end(), writing::needs_lon_lat))
        writing::add_lon_lat(job);
    std::error_code error;
    std::filesystem::create_directories(folder / "layers", error);
    if (error)
        throw MachineError{(folder / "layers").string() + ": cannot be made (" + error.message() +
                           "); choose an output folder that can be written"};
    WrittenLayers written;
    const std::set<campaign::LayerFormat> once{formats.begin(), formats.end()};
    for (const auto format : once)
        writing::write_format(job, format, written);
    std::sort(written.files.begin(), written.files.end());
    return written;
}

} // namespace rillstrand::geo

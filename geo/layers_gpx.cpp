// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"
#include "layers_gdal.hpp"
#include "layers_ogr.hpp"
#include "layers_write.hpp"

#include <ogrsf_frmts.h>

#include <cmath>

namespace rillstrand::geo::writing {

namespace {
/// A short name for a receiver's small screen.
std::string waypoint_name(const Named& named, std::size_t row) {
    std::string name;
    if (const Column* label = named.table().find(named.look.label_by))
        name = cell_text(*label, row);
    if (name.empty())
        name = named.name;
    name += ' ';
    name += std::to_string(row + 1);
    const Column* fibre = named.table().find("fibre_m");
    if (fibre != nullptr && fibre->kind == ColumnKind::real && std::isfinite(fibre->real[row]))
        name += ", " + text::fixed(fibre->real[row], 0) + " m";
    return name;
}

/// Every cell that is there: `share of discharge: 0.12; ...`.
std::string waypoint_text(const Table& table, std::size_t row) {
    std::string text;
    for (const auto& column : table.columns()) {
        const std::string cell = cell_text(column, row);
        if (cell.empty())
            continue;
        if (!text.empty())
            text += "; ";
        text += (column.title.empty() ? column.name : column.title) + ": " + cell;
        if (!column.unit.empty() && column.unit != "1")
            text += " " + column.unit;
    }
    return utf8(text);
}

std::unique_ptr<OGRGeometry> lon_lat_geometry(const Named& named, std::size_t row) {
    const auto& line = named.lon_lat[row];
    if (is_missing(*named.layer, line))
        return nullptr;
    if (named.layer->geometry != GeometryKind::line_string_z) {
        const auto& v = line.front();
        if (named.layer->geometry == GeometryKind::point_z && std::isfinite(v.z()))
            return std::make_unique<OGRPoint>(v.x(), v.y(), v.z());
        return std::make_unique<OGRPoint>(v.x(), v.y());
    }
    auto track = std::make_unique<OGRMultiLineString>();
    auto part = std::make_unique<OGRLineString>();
    for (const auto& v : line)
        if (std::isfinite(v.z()))
            part->addPoint(v.x(), v.y(), v.z());
        else
            part->addPoint(v.x(), v.y());
    track->addGeometryDirectly(part.release());
    return track;
}

void add_waypoints(OGRLayer& target, const Named& named) {
    for (std::size_t row = 0; row < named.table().rows(); ++row) {
        auto geometry = lon_lat_geometry(named, row);
        if (geometry == nullptr)
            continue; // the format has no waypoint without a place
        OGRFeature feature{target.GetLayerDefn()};
        feature.SetField("name", utf8(waypoint_name(named, row)).c_str());
        feature.SetField("desc", waypoint_text(named.table(), row).c_str());
        feature.SetField("type", named.name.c_str());
        feature.SetGeometryDirectly(geometry.release());
        if (target.CreateFeature(&feature) != OGRERR_NONE)
            return;
    }
}

void add_tracks(OGRLayer& target, const Named& named) {
    for (std::size_t row = 0; row < named.table().rows(); ++row) {
        auto geometry = lon_lat_geometry(named, row);
        if (geometry == nullptr)
            continue;
        OGRFeature feature{target.GetLayerDefn()};
        std::string name = named.name;
        if (const Column* label = named.table().find(named.look.label_by))
            name = cell_text(*label, row);
        feature.SetField("name", utf8(name).c_str());
        feature.SetField("desc", waypoint_text(named.table(), row).c_str());
        feature.SetGeometryDirectly(geometry.release());
        if (target.CreateFeature(&feature) != OGRERR_NONE)
            return;
    }
}

void fill(GDALDataset& file, const Job& job, const GdalFailures& failures) {
    OGRSpatialReference crs = wgs84();
    OGRLayer* points = file.CreateLayer("waypoints", &crs, wkbPoint25D, nullptr);
    if (points == nullptr)
        return;
    for (const auto& named : job.layers)
        if (named.look.waypoints && named.has_geometry() && !failures.any() &&
            named.layer->geometry != GeometryKind::line_string_z)
            add_waypoints(*points, named);
    OGRLayer* tracks = file.CreateLayer("tracks", &crs, wkbMultiLineString25D, nullptr);
    if (tracks == nullptr)
        return;
    for (const auto& named : job.layers)
        if (named.layer->geometry == GeometryKind::line_string_z && !failures.any())
            add_tracks(*tracks, named);
}
} // namespace

// GPX 1.1: findings as waypoints, the cable as tracks. The library's writer of this format does not
// notice a full disk, so it writes to memory (findings are few) and the file is written here.
void write_gpx(const Job& job, WrittenLayers& written) {
    const auto path = job.folder / "findings.gpx";
    const MemoryFile memory{"findings.gpx"};
    const GdalFailures failures;
    Dataset file{driver("GPX")->Create(memory.name().c_str(), 0, 0, 0, GDT_Unknown, nullptr)};
    if (!file)
        failures.give_up(path);
    fill(*file, job, failures);
    file.reset();
    failures.throw_if_any(path);
    write_text(path, memory.content());
    written.files.emplace_back("findings.gpx");
}

} // namespace rillstrand::geo::writing

// SPDX-License-Identifier: Apache-2.0
#include "geo_layers/reread.hpp"

#include "base/text.hpp"

#include <catch2/catch.hpp>

#include <cmath>

namespace rillstrand::geo::reread {

File open(const std::filesystem::path& path, const std::vector<std::string>& options) {
    GDALAllRegister();
    CPLStringList list;
    for (const auto& option : options)
        list.AddString(option.c_str());
    return File{GDALDataset::Open(path.c_str(), GDAL_OF_VECTOR | GDAL_OF_READONLY, nullptr,
                                  list.List(), nullptr)};
}

namespace {
bool placed(const Layer& layer, std::size_t row) {
    if (layer.geometry == GeometryKind::none)
        return false;
    const auto& v = layer.vertices[row];
    return !v.empty() && std::isfinite(v.front().x());
}

void check_real(OGRFeature& feature, int field, double value, const Promise& promise) {
    if (!std::isfinite(value)) {
        CHECK_FALSE(feature.IsFieldSetAndNotNull(field));
        return;
    }
    REQUIRE(feature.IsFieldSetAndNotNull(field));
    CHECK(std::abs(feature.GetFieldAsDouble(field) - value) <= promise.relative * std::abs(value));
}

void check_text(OGRFeature& feature, int field, const std::string& value) {
    if (value.empty())
        CHECK_FALSE((feature.IsFieldSetAndNotNull(field) &&
                     feature.GetFieldAsString(field) != std::string{}));
    else
        CHECK(feature.GetFieldAsString(field) == value);
}

void check_time(OGRFeature& feature, int field, double unix_s) {
    if (!std::isfinite(unix_s)) {
        CHECK_FALSE(feature.IsFieldSetAndNotNull(field));
        return;
    }
    int y = 0, mo = 0, d = 0, h = 0, mi = 0, zone = 0;
    float s = 0.0F;
    REQUIRE(feature.GetFieldAsDateTime(field, &y, &mo, &d, &h, &mi, &s, &zone));
    CHECK(zone == 100); // OGR's UTC
    const auto iso = text::iso_time(unix_s);
    char text[64] = {};
    std::snprintf(text, sizeof text, "%04d-%02d-%02dT%02d:%02d:%02d", y, mo, d, h, mi,
                  static_cast<int>(s));
    CHECK(text == iso.substr(0, 19));
    CHECK(std::abs(static_cast<double>(s) - std::floor(static_cast<double>(s)) -
                   (unix_s - std::floor(unix_s))) < 1e-3);
}

void check_date(OGRFeature& feature, int field, const std::string& date) {
    if (date.empty()) {
        CHECK_FALSE(feature.IsFieldSetAndNotNull(field));
        return;
    }
    int y = 0, mo = 0, d = 0, h = 0, mi = 0, s = 0, zone = 0;
    REQUIRE(feature.GetFieldAsDateTime(field, &y, &mo, &d, &h, &mi, &s, &zone));
    char text[64] = {};
    std::snprintf(text, sizeof text, "%04d-%02d-%02d", y, mo, d);
    CHECK(text == date);
}

void check_cell(OGRFeature& feature, int field, const Column& column, std::size_t row,
                const Promise& promise) {
    INFO("column " << column.name << ", row " << row);
    switch (column.kind) {
    case ColumnKind::real:
        return check_real(feature, field, column.real[row], promise);
    case ColumnKind::integer:
        CHECK(feature.GetFieldAsInteger64(field) == column.integer[row]);
        return;
    case ColumnKind::boolean: {
        const bool one = feature.GetFieldAsString(field) == std::string{"true"} ||
                         feature.GetFieldAsInteger(field) == 1;
        CHECK(one == (column.integer[row] == 1));
        return;
    }
    case ColumnKind::text:
        return check_text(feature, field, column.text[row]);
    case ColumnKind::time:
        if (promise.types)
            return check_time(feature, field, column.real[row]);
        return check_text(feature, field, text::iso_time(column.real[row]));
    case ColumnKind::date:
        if (promise.types)
            return check_date(feature, field, column.text[row]);
        return check_text(feature, field, column.text[row]);
    }
}

void check_vertex(const OGRPoint& point, const Eigen::Vector3d& v, bool has_z,
                  const Promise& promise) {
    if (promise.degrees == 0.0) {
        CHECK(std::abs(point.getX() - v.x()) <= promise.metres);
        CHECK(std::abs(point.getY() - v.y()) <= promise.metres);
    }
    if (has_z && std::isfinite(v.z())) {
        CHECK(std::abs(point.getZ() - v.z()) <= std::max(promise.metres, 5e-4));
    } else if (has_z) {
        const bool unknown = !point.Is3D() || std::isnan(point.getZ());
        CHECK(unknown);
    } else {
        CHECK_FALSE(point.Is3D());
    }
}

/// The same positions brought to longitude and latitude by PROJ, the outside reference here.
void to_degrees(OGRGeometry& geometry) {
    OGRSpatialReference from, to;
    from.importFromEPSG(25832);
    to.importFromEPSG(4326);
    from.SetAxisMappingStrategy(OAMS_TRADITIONAL_GIS_ORDER);
    to.SetAxisMappingStrategy(OAMS_TRADITIONAL_GIS_ORDER);
    geometry.assignSpatialReference(&from);
    REQUIRE(geometry.transformTo(&to) == OGRERR_NONE);
    geometry.assignSpatialReference(nullptr);
}

void check_degrees(const OGRPoint& point, const Eigen::Vector3d& v, const Promise& promise) {
    OGRPoint expected{v.x(), v.y()};
    to_degrees(expected);
    CHECK(std::abs(point.getX() - expected.getX()) <= promise.degrees);
    CHECK(std::abs(point.getY() - expected.getY()) <= promise.degrees);
}

void check_geometry(OGRFeature& feature, const Layer& written, std::size_t row,
                    const Promise& promise) {
    INFO("geometry of row " << row);
    const OGRGeometry* geometry = feature.GetGeometryRef();
    if (!placed(written, row)) {
        CHECK(geometry == nullptr);
        return;
    }
    REQUIRE(geometry != nullptr);
    const bool has_z = promise.heights && written.geometry != GeometryKind::point;
    const auto& vertices = written.vertices[row];
    const bool is_line = written.geometry == GeometryKind::line_string_z;
    if (is_line) {
        REQUIRE(wkbFlatten(geometry->getGeometryType()) == wkbLineString);
        REQUIRE(geometry->toLineString()->getNumPoints() == static_cast<int>(vertices.size()));
    }
    for (std::size_t i = 0; i < vertices.size(); ++i) {
        OGRPoint point;
        if (is_line)
            geometry->toLineString()->getPoint(static_cast<int>(i), &point);
        else
            point = *geometry->toPoint();
        check_vertex(point, vertices[i], has_z, promise);
        if (promise.degrees > 0.0)
            check_degrees(point, vertices[i], promise);
    }
}
} // namespace

namespace {
using Feature = std::unique_ptr<OGRFeature>;

/// The feature of a row: the next one, or the one whose first cell has the row's value.
Feature feature_of(OGRLayer& layer, const Layer& written, std::size_t row, const Promise& promise) {
    if (promise.order)
        return Feature{layer.GetNextFeature()};
    layer.ResetReading();
    const Column& key = written.table.columns().front();
    while (Feature feature{layer.GetNextFeature()}) {
        const int field = feature->GetFieldIndex(key.name.c_str());
        const bool same = key.kind == ColumnKind::real
                              ? std::abs(feature->GetFieldAsDouble(field) - key.real[row]) < 1e-9
                              : feature->GetFieldAsString(field) == key.text[row];
        if (same)
            return feature;
    }
    return nullptr;
}
} // namespace

void check_layer(GDALDataset& file, const std::string& name, const Layer& written,
                 const Promise& promise) {
    INFO("layer " << name);
    OGRLayer* layer = file.GetLayerByName(name.c_str());
    REQUIRE(layer != nullptr);
    layer->ResetReading();
    GIntBig rows = 0;
    for (std::size_t row = 0; row < written.table.rows(); ++row) {
        if (!promise.unplaced_rows && !placed(written, row))
            continue;
        ++rows;
        const Feature feature = feature_of(*layer, written, row, promise);
        REQUIRE(feature != nullptr);
        for (const auto& column : written.table.columns()) {
            const std::string field_name =
                promise.field_name ? promise.field_name(column.name) : column.name;
            const int field = feature->GetFieldIndex(field_name.c_str());
            INFO("field " << field_name);
            REQUIRE(field >= 0);
            check_cell(*feature, field, column, row, promise);
        }
        check_geometry(*feature, written, row, promise);
    }
    CHECK(layer->GetFeatureCount() == rows);
}

} // namespace rillstrand::geo::reread

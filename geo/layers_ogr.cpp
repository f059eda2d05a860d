// SPDX-License-Identifier: Apache-2.0
#include "layers_ogr.hpp"

#include "layers_write.hpp"

#include <charconv>
#include <chrono>
#include <cmath>

namespace rillstrand::geo::writing {

OGRwkbGeometryType ogr_type(GeometryKind kind) {
    switch (kind) {
    case GeometryKind::none:
        return wkbNone;
    case GeometryKind::point:
        return wkbPoint;
    case GeometryKind::point_z:
        return wkbPoint25D;
    case GeometryKind::line_string_z:
        return wkbLineString25D;
    }
    return wkbNone;
}

std::unique_ptr<OGRFieldDefn> ogr_field(const Column& column, const std::string& name) {
    auto field = std::make_unique<OGRFieldDefn>(name.c_str(), OFTReal);
    switch (column.kind) {
    case ColumnKind::real:
        break;
    case ColumnKind::integer:
        field->SetType(OFTInteger64);
        break;
    case ColumnKind::boolean:
        field->SetType(OFTInteger);
        field->SetSubType(OFSTBoolean);
        break;
    case ColumnKind::text:
        field->SetType(OFTString);
        break;
    case ColumnKind::time:
        field->SetType(OFTDateTime);
        break;
    case ColumnKind::date:
        field->SetType(OFTDate);
        break;
    }
    return field;
}

bool parse_date(const std::string& text, int& year, int& month, int& day) {
    if (text.size() != 10 || text[4] != '-' || text[7] != '-')
        return false;
    const auto read = [&](std::size_t from, std::size_t size, int& value) {
        const char* begin = text.data() + from;
        const auto [end, error] = std::from_chars(begin, begin + size, value);
        return error == std::errc{} && end == begin + size;
    };
    return read(0, 4, year) && read(5, 2, month) && read(8, 2, day);
}

namespace {
constexpr int utc_flag = 100; // OGR's mark of UTC in a date and time

void set_time(OGRFeature& feature, int field, double unix_s) {
    if (!std::isfinite(unix_s))
        return feature.SetFieldNull(field);
    const std::chrono::milliseconds since{static_cast<long long>(std::round(unix_s * 1e3))};
    const auto days = std::chrono::floor<std::chrono::days>(since);
    const std::chrono::year_month_day date{std::chrono::sys_days{days}};
    const std::chrono::hh_mm_ss clock{since - days};
    const double seconds = static_cast<double>(clock.seconds().count()) +
                           static_cast<double>(clock.subseconds().count()) / 1e3;
    feature.SetField(
        field, static_cast<int>(date.year()), static_cast<int>(static_cast<unsigned>(date.month())),
        static_cast<int>(static_cast<unsigned>(date.day())),
        static_cast<int>(clock.hours().count()), static_cast<int>(clock.minutes().count()),
        static_cast<float>(seconds), utc_flag);
}

void set_date(OGRFeature& feature, int field, const std::string& text) {
    int year = 0, month = 0, day = 0;
    if (!parse_date(text, year, month, day))
        return feature.SetFieldNull(field);
    feature.SetField(field, year, month, day, 0, 0, 0.0F, 0);
}
} // namespace

void set_cell(OGRFeature& feature, int field, const Column& column, std::size_t row) {
    switch (column.kind) {
    case ColumnKind::real:
        if (std::isfinite(column.real[row]))
            feature.SetField(field, column.real[row]);
        else
            feature.SetFieldNull(field);
        break;
    case ColumnKind::time:
        set_time(feature, field, column.real[row]);
        break;
    case ColumnKind::integer:
        feature.SetField(field, static_cast<GIntBig>(column.integer[row]));
        break;
    case ColumnKind::boolean:
        feature.SetField(field, column.integer[row] != 0 ? 1 : 0);
        break;
    case ColumnKind::text:
        if (column.text[row].empty())
            feature.SetFieldNull(field);
        else
            feature.SetField(field, utf8(column.text[row]).c_str());
        break;
    case ColumnKind::date:
        set_date(feature, field, column.text[row]);
        break;
    }
}

std::unique_ptr<OGRGeometry> ogr_geometry(const Layer& layer, std::size_t row, bool with_z) {
    const auto& vertices = layer.vertices[row];
    if (is_missing(layer, vertices))
        return nullptr;
    if (layer.geometry != GeometryKind::line_string_z) {
        const auto& v = vertices.front();
        if (with_z && layer.geometry == GeometryKind::point_z)
            return std::make_unique<OGRPoint>(v.x(), v.y(), v.z());
        return std::make_unique<OGRPoint>(v.x(), v.y());
    }
    auto line = std::make_unique<OGRLineString>();
    line->setNumPoints(static_cast<int>(vertices.size()), FALSE);
    for (std::size_t i = 0; i < vertices.size(); ++i) {
        const auto& v = vertices[i];
        if (with_z)
            line->setPoint(static_cast<int>(i), v.x(), v.y(), v.z());
        else
            line->setPoint(static_cast<int>(i), v.x(), v.y());
    }
    return line;
}

bool add_rows(OGRLayer& target, const Layer& layer) {
    const auto& columns = layer.table.columns();
    OGRFeature feature{target.GetLayerDefn()};
    for (std::size_t row = 0; row < layer.table.rows(); ++row) {
        feature.SetFID(OGRNullFID);
        for (std::size_t j = 0; j < columns.size(); ++j)
            set_cell(feature, static_cast<int>(j), columns[j], row);
        if (layer.geometry != GeometryKind::none)
            feature.SetGeometryDirectly(ogr_geometry(layer, row).release());
        if (target.CreateFeature(&feature) != OGRERR_NONE)
            return false;
    }
    return true;
}

} // namespace rillstrand::geo::writing

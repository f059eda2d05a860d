// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"
#include "layers_write.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <cstdio>
#include <limits>

// KML 2.2 (OGC 07-147r2), written as text: one document, a folder a layer.
namespace rillstrand::geo::writing {

namespace {
constexpr int degree_decimals = 8;
constexpr int height_decimals = 3;
constexpr std::size_t piece_size = std::size_t{1} << 20U;

std::string coordinates(const std::vector<Eigen::Vector3d>& line, bool with_z) {
    std::string text;
    for (const auto& v : line) {
        if (!text.empty())
            text += ' ';
        text += text::fixed(v.x(), degree_decimals) + ',' + text::fixed(v.y(), degree_decimals);
        if (with_z && std::isfinite(v.z()))
            text += ',' + text::fixed(v.z(), height_decimals);
    }
    return text;
}

void add_geometry(std::string& out, const Named& named, std::size_t row) {
    const auto& line = named.lon_lat[row];
    if (is_missing(*named.layer, line))
        return;
    const auto kind = named.layer->geometry;
    const char* element = kind == GeometryKind::line_string_z ? "LineString" : "Point";
    out += std::string{"<"} + element + "><coordinates>" +
           coordinates(line, kind != GeometryKind::point) + "</coordinates></" + element + ">";
}

/// KML's integers have 32 bits.
bool fits_int(const Column& column) {
    return std::all_of(column.integer.begin(), column.integer.end(), [](std::int64_t v) {
        return v >= std::numeric_limits<std::int32_t>::min() &&
               v <= std::numeric_limits<std::int32_t>::max();
    });
}

const char* schema_type(const Column& column) {
    switch (column.kind) {
    case ColumnKind::real:
        return "double";
    case ColumnKind::integer:
        return fits_int(column) ? "int" : "string";
    case ColumnKind::boolean:
        return "bool";
    case ColumnKind::text:
    case ColumnKind::time:
    case ColumnKind::date:
        return "string";
    }
    return "string";
}

std::string schema(const Named& named) {
    std::string text = "<Schema name=\"" + named.name + "\" id=\"" + named.name + "_fields\">\n";
    for (const auto& column : named.table().columns()) {
        std::string title = column.title.empty() ? column.name : column.title;
        if (!column.unit.empty())
            title += " [" + column.unit + "]";
        text += std::string{"<SimpleField type=\""} + schema_type(column) + "\" name=\"" +
                xml(column.name) + "\"><displayName>" + xml(title) +
                "</displayName></SimpleField>\n";
    }
    return text + "</Schema>\n";
}

/// KML writes colours as alpha, blue, green, red.
std::string kml_colour(Rgb colour) {
    std::array<char, 16> buffer{};
    std::snprintf(buffer.data(), buffer.size(), "ff%02x%02x%02x", static_cast<unsigned>(colour.b),
                  static_cast<unsigned>(colour.g), static_cast<unsigned>(colour.r));
    return buffer.data();
}

std::string style_id(const Named& named, std::size_t rule) {
    return named.name + "_" + std::to_string(rule);
}

std::string styles(const Named& named, const LayerStyle& style) {
    std::string text;
    for (std::size_t i = 0; i < style.classes.size(); ++i) {
        const std::string colour = kml_colour(style.classes[i].colour);
        text += joined(
            {"<Style id=\"", style_id(named, i), "\"><IconStyle><color>", colour,
             "</color><scale>0.6</scale></IconStyle><LabelStyle><scale>0</scale></LabelStyle>",
             "<LineStyle><color>", colour, "</color><width>3</width></LineStyle></Style>\n"});
    }
    return text;
}

void add_data(std::string& out, const Named& named, std::size_t row) {
    out += "<ExtendedData><SchemaData schemaUrl=\"#" + named.name + "_fields\">";
    for (const auto& column : named.table().columns()) {
        const std::string cell = cell_text(column, row);
        if (cell.empty())
            continue;
        out += "<SimpleData name=\"" + xml(column.name) + "\">";
        if (column.kind == ColumnKind::boolean)
            out += cell == "true" ? '1' : '0';
        else
            out += xml(cell);
        out += "</SimpleData>";
    }
    out += "</SchemaData></ExtendedData>";
}

std::string placemark_name(const Named& named, std::size_t row) {
    const Column* label =
        named.look.label_by.empty() ? nullptr : named.table().find(named.look.label_by);
    const std::string text = label == nullptr ? std::string{} : cell_text(*label, row);
    return text.empty() ? named.name + " " + std::to_string(row + 1) : text;
}

void add_folder(std::string& out, const Named& named, const LayerStyle& style,
                const std::function<void(std::string&)>& next) {
    out += "<Folder><name>" + named.name + "</name>\n";
    for (std::size_t row = 0; row < named.table().rows(); ++row) {
        out += "<Placemark><name>" + xml(placemark_name(named, row)) + "</name>";
        if (const auto rule = matching_class(style, named.table(), row); rule.has_value())
            out += "<styleUrl>#" + style_id(named, *rule) + "</styleUrl>";
        add_data(out, named, row);
        add_geometry(out, named, row);
        out += "</Placemark>\n";
        if (out.size() > piece_size)
            next(out);
    }
    out += "</Folder>\n";
}

void write_document(const Job& job, const std::function<void(std::string&)>& next) {
    std::vector<const Named*> placed;
    std::vector<LayerStyle> looks;
    for (const auto& named : job.layers)
        if (named.has_geometry()) {
            placed.push_back(&named);
            looks.push_back(make_style(named.table(), named.layer->geometry, named.look));
        }
    std::string piece = "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n"
                        "<kml xmlns=\"http://www.opengis.net/kml/2.2\">\n<Document>\n<name>" +
                        xml(job.set->title) + "</name>\n";
    if (!job.set->summary.empty())
        piece += "<description>" + xml(job.set->summary) + "</description>\n";
    // The order that KML's schema asks for: styles, then schemas, then folders.
    for (std::size_t i = 0; i < placed.size(); ++i)
        piece += styles(*placed[i], looks[i]);
    for (const auto* named : placed)
        piece += schema(*named);
    for (std::size_t i = 0; i < placed.size(); ++i)
        add_folder(piece, *placed[i], looks[i], next);
    piece += "</Document>\n</kml>\n";
    next(piece);
}
} // namespace

void write_kml(const Job& job, WrittenLayers& written) {
    write_pieces(job.folder / "layers.kml",
                 [&](const std::function<void(std::string&)>& next) { write_document(job, next); });
    written.files.emplace_back("layers.kml");
    warn_of_tables(job, "layers.kml", written);
}

} // namespace rillstrand::geo::writing

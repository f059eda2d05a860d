// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"
#include "layers_write.hpp"

#include <cmath>

namespace rillstrand::geo::writing {

namespace {
std::string position(const Eigen::Vector3d& v, bool with_z) {
    std::string text = text::number(v.x()) + ' ' + text::number(v.y());
    if (with_z)
        text += ' ' + text::number(v.z());
    return text;
}

/// Well-known text (ISO 19125), empty where the geometry is missing; flat where a height is
/// unknown.
std::string wkt(const Layer& layer, std::size_t row) {
    const auto& vertices = layer.vertices[row];
    if (is_missing(layer, vertices))
        return {};
    bool with_z = layer.geometry != GeometryKind::point;
    for (const auto& v : vertices)
        with_z = with_z && std::isfinite(v.z());
    if (layer.geometry != GeometryKind::line_string_z)
        return (with_z ? "POINT Z (" : "POINT (") + position(vertices.front(), with_z) + ')';
    std::string text = with_z ? "LINESTRING Z (" : "LINESTRING (";
    for (std::size_t i = 0; i < vertices.size(); ++i)
        text += (i > 0 ? ", " : "") + position(vertices[i], with_z);
    return text + ')';
}

void add_column(Table& table, const Column& c) {
    switch (c.kind) {
    case ColumnKind::real:
        return table.add_real(c.name, c.title, c.unit, c.real, c.decimals);
    case ColumnKind::time:
        return table.add_time(c.name, c.title, c.real);
    case ColumnKind::integer:
        return table.add_integer(c.name, c.title, c.integer);
    case ColumnKind::boolean:
        return table.add_boolean(c.name, c.title, {c.integer.begin(), c.integer.end()});
    case ColumnKind::text:
        return table.add_text(c.name, c.title, c.text);
    case ColumnKind::date:
        return table.add_date(c.name, c.title, c.text);
    }
}

/// The table with its geometries as the first column.
Table with_wkt(const Layer& layer) {
    std::vector<std::string> texts(layer.table.rows());
    for (std::size_t row = 0; row < texts.size(); ++row)
        texts[row] = wkt(layer, row);
    Table table{layer.table.name(), layer.table.title()};
    table.add_text("WKT", "geometry as well-known text", std::move(texts));
    for (const auto& column : layer.table.columns())
        add_column(table, column);
    return table;
}
} // namespace

void write_csv(const Job& job, WrittenLayers& written) {
    for (const auto& named : job.layers) {
        const auto name = std::filesystem::path{"layers"} / (named.name + ".csv");
        write_text(job.folder / name,
                   to_csv(named.has_geometry() ? with_wkt(*named.layer) : named.table()));
        written.files.push_back(name);
    }
}

} // namespace rillstrand::geo::writing

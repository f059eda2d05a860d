// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"
#include "layers_write.hpp"

#include <cmath>

namespace rillstrand::geo::writing {

namespace {
using Line = std::vector<Eigen::Vector3d>;

constexpr int degree_decimals = 8; // 1.1 mm along a meridian
constexpr int height_decimals = 3;
constexpr std::size_t piece_size = std::size_t{1} << 20U;

void add_position(std::string& out, const Eigen::Vector3d& v, bool with_z) {
    out += '[';
    out += text::fixed(v.x(), degree_decimals);
    out += ',';
    out += text::fixed(v.y(), degree_decimals);
    if (with_z && std::isfinite(v.z())) {
        out += ',';
        out += text::fixed(v.z(), height_decimals);
    }
    out += ']';
}

void add_positions(std::string& out, const Line& line) {
    out += '[';
    for (std::size_t i = 0; i < line.size(); ++i) {
        if (i > 0)
            out += ',';
        add_position(out, line[i], true);
    }
    out += ']';
}

/// RFC 7946, 3.1.9: a line that crosses the antimeridian is cut there.
std::vector<Line> cut_at_antimeridian(const Line& line) {
    std::vector<Line> parts(1);
    for (std::size_t i = 0; i < line.size(); ++i) {
        if (i > 0 && std::abs(line[i].x() - line[i - 1].x()) > 180.0) {
            const Eigen::Vector3d& before = line[i - 1];
            Eigen::Vector3d after = line[i];
            const double edge = before.x() > 0.0 ? 180.0 : -180.0;
            after.x() += 2.0 * edge;
            const double width = after.x() - before.x();
            const double share = width == 0.0 ? 0.0 : (edge - before.x()) / width;
            Eigen::Vector3d crossing = before + share * (after - before);
            crossing.x() = edge;
            parts.back().push_back(crossing);
            crossing.x() = -edge;
            parts.push_back({crossing});
        }
        parts.back().push_back(line[i]);
    }
    return parts;
}

void add_line(std::string& out, const Line& line) {
    const auto parts = cut_at_antimeridian(line);
    out += parts.size() == 1 ? R"({"type":"LineString","coordinates":)"
                             : R"({"type":"MultiLineString","coordinates":[)";
    for (std::size_t i = 0; i < parts.size(); ++i) {
        if (i > 0)
            out += ',';
        add_positions(out, parts[i]);
    }
    out += parts.size() == 1 ? "}" : "]}";
}

void add_geometry(std::string& out, const Named& named, std::size_t row) {
    if (!named.has_geometry() || is_missing(*named.layer, named.lon_lat[row])) {
        out += "null";
        return;
    }
    const Line& line = named.lon_lat[row];
    if (named.layer->geometry == GeometryKind::line_string_z)
        return add_line(out, line);
    out += R"({"type":"Point","coordinates":)";
    add_position(out, line.front(), named.layer->geometry == GeometryKind::point_z);
    out += '}';
}

void add_value(std::string& out, const Column& column, std::size_t row) {
    const std::string cell = cell_text(column, row);
    const bool quoted = column.kind == ColumnKind::text || column.kind == ColumnKind::time ||
                        column.kind == ColumnKind::date;
    if (cell.empty())
        out += "null";
    else
        out += quoted ? json(cell) : cell;
}

void add_feature(std::string& out, const Named& named, const std::vector<std::string>& keys,
                 std::size_t row) {
    out += R"({"type":"Feature","id":)" + std::to_string(row + 1) + R"(,"properties":{)";
    const auto& columns = named.table().columns();
    for (std::size_t j = 0; j < columns.size(); ++j) {
        out += keys[j];
        add_value(out, columns[j], row);
    }
    out += R"(},"geometry":)";
    add_geometry(out, named, row);
    out += '}';
}

void write_layer(const Named& named, const std::filesystem::path& file) {
    std::vector<std::string> keys;
    for (const auto& column : named.table().columns()) {
        std::string key = json(column.name) + ':';
        if (!keys.empty())
            key.insert(0, 1, ',');
        keys.push_back(std::move(key));
    }
    write_pieces(file, [&](const std::function<void(std::string&)>& next) {
        std::string piece =
            R"({"type":"FeatureCollection","name":)" + json(named.name) + R"(,"features":[)";
        for (std::size_t row = 0; row < named.table().rows(); ++row) {
            piece += row > 0 ? ",\n" : "\n";
            add_feature(piece, named, keys, row);
            if (piece.size() > piece_size)
                next(piece);
        }
        piece += "\n]}\n";
        next(piece);
    });
}
} // namespace

// RFC 7946: WGS 84 longitude and latitude, no `crs` member, NaN as null.
void write_geojson(const Job& job, WrittenLayers& written) {
    for (const auto& named : job.layers) {
        const auto name = std::filesystem::path{"layers"} / (named.name + ".geojson");
        write_layer(named, job.folder / name);
        written.files.push_back(name);
    }
}

} // namespace rillstrand::geo::writing

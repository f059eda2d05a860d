// SPDX-License-Identifier: Apache-2.0
#include "layers_gpkg_tables.hpp"

#include "base/text.hpp"
#include "layers_rtree.hpp"

#include <algorithm>

namespace rillstrand::geo::writing {

std::string sql_text(std::string_view text) {
    std::string result = "'";
    for (const char c : utf8(text)) {
        if (c == '\0')
            continue;
        if (c == '\'')
            result += '\'';
        result += c;
    }
    return result + "'";
}

std::string sql_name(std::string_view name) {
    std::string result = "\"";
    for (const char c : name) {
        if (c == '\0')
            continue;
        if (c == '"')
            result += '"';
        result += c;
    }
    return result + "\"";
}

std::string free_name(const Table& table, const std::string& wanted) {
    std::string name = wanted;
    const auto taken = [&] {
        return std::any_of(table.columns().begin(), table.columns().end(),
                           [&](const Column& c) { return text::slug(c.name) == name; });
    };
    while (taken())
        name.insert(0, "row_");
    return name;
}

std::string with_milliseconds(std::string time) {
    if (time.size() == 20 && time.back() == 'Z')
        time.replace(19, 1, ".000Z");
    return time;
}

std::string described(const LayerSet& set, const Named& named) {
    std::string text = named.table().title().empty() ? named.name : named.table().title();
    if (!set.title.empty())
        text += " of " + set.title;
    return utf8(text);
}

namespace {
const Named* find_layer(const Job& job, const std::string& table_name) {
    const std::string name = text::slug(table_name);
    for (const auto& named : job.layers)
        if (named.name == name)
            return &named;
    return nullptr;
}

/// A view whose two layers and key are there.
struct UsableView {
    const TimeView* view;
    const Named* table;
    const Named* points;
    std::string name;
};

std::vector<UsableView> usable_views(const Job& job) {
    std::vector<UsableView> list;
    for (const auto& view : job.set->views) {
        const Named* table = find_layer(job, view.table);
        const Named* points = find_layer(job, view.points);
        if (table == nullptr || points == nullptr || !points->has_geometry())
            continue;
        if (points->table().find(view.key) == nullptr)
            continue;
        if (view.place.empty() && table->table().find(view.key) == nullptr)
            continue;
        list.push_back({&view, table, points, text::slug(view.name)});
    }
    return list;
}

Look view_look(const UsableView& view) {
    Look look = complete_look(view.table->table(), view.view->look);
    for (const auto& column : view.table->table().columns())
        if (look.time_by.empty() &&
            (column.kind == ColumnKind::date || column.kind == ColumnKind::time))
            look.time_by = column.name;
    return look;
}
} // namespace

std::vector<PlacedStyle> styles_of(const Job& job) {
    std::vector<PlacedStyle> styles;
    for (const auto& named : job.layers) {
        if (!named.has_geometry())
            continue;
        PlacedStyle placed{make_style(named.table(), named.layer->geometry, named.look),
                           free_name(named.table(), "geom")};
        placed.style.layer = named.name;
        styles.push_back(std::move(placed));
    }
    for (const auto& view : usable_views(job)) {
        PlacedStyle placed{
            make_style(view.table->table(), view.points->layer->geometry, view_look(view)),
            free_name(view.points->table(), "geom")};
        placed.style.layer = view.name;
        placed.style.title = view.view->title;
        styles.push_back(std::move(placed));
    }
    return styles;
}

namespace {
// Annex C.8, C.9, C.10, C.11 of the standard, word for word but for blanks.
constexpr const char* extensions_table =
    "CREATE TABLE IF NOT EXISTS gpkg_extensions (table_name TEXT, column_name TEXT, "
    "extension_name TEXT NOT NULL, definition TEXT NOT NULL, scope TEXT NOT NULL, "
    "CONSTRAINT ge_tce UNIQUE (table_name, column_name, extension_name))";
constexpr const char* data_columns_table =
    "CREATE TABLE IF NOT EXISTS gpkg_data_columns (table_name TEXT NOT NULL, column_name TEXT "
    "NOT NULL, name TEXT, title TEXT, description TEXT, mime_type TEXT, constraint_name TEXT, "
    "CONSTRAINT pk_gdc PRIMARY KEY (table_name, column_name), "
    "CONSTRAINT gdc_tn UNIQUE (table_name, name))";
constexpr const char* constraints_table =
    "CREATE TABLE IF NOT EXISTS gpkg_data_column_constraints (constraint_name TEXT NOT NULL, "
    "constraint_type TEXT NOT NULL, value TEXT, min NUMERIC, min_is_inclusive BOOLEAN, "
    "max NUMERIC, max_is_inclusive BOOLEAN, description TEXT, "
    "CONSTRAINT gdcc_ntv UNIQUE (constraint_name, constraint_type, value))";
constexpr const char* metadata_table =
    "CREATE TABLE IF NOT EXISTS gpkg_metadata (id INTEGER CONSTRAINT m_pk PRIMARY KEY ASC NOT "
    "NULL, md_scope TEXT NOT NULL DEFAULT 'dataset', md_standard_uri TEXT NOT NULL, mime_type "
    "TEXT NOT NULL DEFAULT 'text/xml', metadata TEXT NOT NULL DEFAULT '')";
constexpr const char* reference_table =
    "CREATE TABLE IF NOT EXISTS gpkg_metadata_reference (reference_scope TEXT NOT NULL, "
    "table_name TEXT, column_name TEXT, row_id_value INTEGER, timestamp DATETIME NOT NULL "
    "DEFAULT (strftime('%Y-%m-%dT%H:%M:%fZ','now')), md_file_id INTEGER NOT NULL, md_parent_id "
    "INTEGER, CONSTRAINT crmr_mfi_fk FOREIGN KEY (md_file_id) REFERENCES gpkg_metadata(id), "
    "CONSTRAINT crmr_mpi_fk FOREIGN KEY (md_parent_id) REFERENCES gpkg_metadata(id))";

std::string extension_row(const std::string& table, const std::string& extension,
                          const std::string& part) {
    return "INSERT INTO gpkg_extensions VALUES (" + sql_text(table) + ", NULL, " +
           sql_text(extension) + ", " + sql_text("http://www.geopackage.org/spec130/#" + part) +
           ", 'read-write')";
}

void add_element(std::string& text, const char* name, const std::string& value) {
    if (!value.empty())
        text += std::string{"  <"} + name + ">" + xml(value) + "</" + name + ">\n";
}

/// Dublin Core terms (ISO 15836-1), the plainest metadata that every catalogue reads.
std::string metadata_xml(const LayerSet& set, const std::string& title,
                         const std::string& description) {
    std::string text = "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n"
                       "<metadata xmlns:dc=\"http://purl.org/dc/elements/1.1/\" "
                       "xmlns:dcterms=\"http://purl.org/dc/terms/\">\n";
    add_element(text, "dc:title", title);
    add_element(text, "dc:description", description);
    add_element(text, "dc:creator", set.creator);
    add_element(text, "dc:publisher", set.institution);
    add_element(text, "dc:rights", set.licence);
    for (const auto& keyword : set.keywords)
        add_element(text, "dc:subject", keyword);
    add_element(text, "dcterms:created", set.now);
    add_element(text, "dcterms:provenance", set.provenance);
    return text + "</metadata>\n";
}

void add_metadata(std::vector<std::string>& sql, const Job& job) {
    const auto add = [&](int id, const std::string& xml_text, const std::string& reference) {
        sql.push_back("INSERT INTO gpkg_metadata VALUES (" + std::to_string(id) +
                      ", 'dataset', 'http://purl.org/dc/elements/1.1/', 'text/xml', " +
                      sql_text(xml_text) + ")");
        sql.push_back("INSERT INTO gpkg_metadata_reference VALUES (" + reference +
                      ", NULL, NULL, " + sql_text(with_milliseconds(job.set->now)) + ", " +
                      std::to_string(id) + (id == 1 ? ", NULL)" : ", 1)"));
    };
    add(1, metadata_xml(*job.set, job.set->title, job.set->summary), "'geopackage', NULL");
    int id = 1;
    for (const auto& named : job.layers)
        add(++id, metadata_xml(*job.set, described(*job.set, named), job.set->summary),
            "'table', " + sql_text(named.name));
}

void add_data_columns(std::vector<std::string>& sql, const Named& named) {
    for (const auto& column : named.table().columns()) {
        if (column.title.empty() && column.unit.empty())
            continue;
        const std::string unit = column.unit.empty() ? "NULL" : sql_text("unit: " + column.unit);
        sql.push_back("INSERT INTO gpkg_data_columns VALUES (" + sql_text(named.name) + ", " +
                      sql_text(column.name) + ", " + sql_text(column.name) + ", " +
                      sql_text(column.title) + ", " + unit + ", NULL, NULL)");
    }
}
} // namespace

std::vector<std::string> description_statements(const Job& job) {
    std::vector<std::string> sql{extensions_table, data_columns_table, constraints_table,
                                 metadata_table, reference_table};
    sql.push_back(extension_row("gpkg_data_columns", "gpkg_schema", "extension_schema"));
    sql.push_back(extension_row("gpkg_data_column_constraints", "gpkg_schema", "extension_schema"));
    sql.push_back(extension_row("gpkg_metadata", "gpkg_metadata", "extension_metadata"));
    sql.push_back(extension_row("gpkg_metadata_reference", "gpkg_metadata", "extension_metadata"));
    for (const auto& named : job.layers)
        add_data_columns(sql, named);
    add_metadata(sql, job);
    return sql;
}

std::vector<std::string> index_statements(const Named& named) {
    std::vector<BoxedRow> rows;
    const auto& vertices = named.layer->vertices;
    for (std::size_t i = 0; i < vertices.size(); ++i) {
        if (is_missing(*named.layer, vertices[i]))
            continue;
        BoxedRow row{
            static_cast<std::int64_t>(i) + 1,
            {vertices[i][0].x(), vertices[i][0].x(), vertices[i][0].y(), vertices[i][0].y()}};
        if (named.layer->geometry == GeometryKind::line_string_z)
            for (const auto& v : vertices[i])
                row.box = {std::min(row.box[0], v.x()), std::max(row.box[1], v.x()),
                           std::min(row.box[2], v.y()), std::max(row.box[3], v.y())};
        rows.push_back(row);
    }
    return tree_statements(named.name, free_name(named.table(), "geom"),
                           free_name(named.table(), "fid"), rows);
}

namespace {
std::string create_view(const UsableView& view) {
    const std::string key = sql_name(view.view->key);
    std::string columns;
    for (const auto& column : view.table->table().columns()) {
        columns += ", t.";
        columns += sql_name(column.name);
    }
    const std::string same = view.view->place.empty() ? "t." + key : sql_text(view.view->place);
    // The first column is what GIS programs take for the row's number.
    return joined({"CREATE VIEW ", sql_name(view.name), " AS SELECT t.",
                   sql_name(free_name(view.table->table(), "fid")), " AS OGC_FID, p.",
                   sql_name(free_name(view.points->table(), "geom")), columns, " FROM ",
                   sql_name(view.table->name), " AS t JOIN ", sql_name(view.points->name),
                   " AS p ON p.", key, " = ", same});
}
} // namespace

std::vector<std::string> view_statements(const Job& job) {
    std::vector<std::string> sql;
    for (const auto& view : usable_views(job)) {
        const std::string points = sql_text(view.points->name);
        sql.push_back(joined({"CREATE INDEX ", sql_name(view.name + "_places"), " ON ",
                              sql_name(view.points->name), " (", sql_name(view.view->key), ")"}));
        // A temporal player asks for one day after the other.
        if (const std::string time = view_look(view).time_by; !time.empty())
            sql.push_back(joined({"CREATE INDEX ", sql_name(view.name + "_times"), " ON ",
                                  sql_name(view.table->name), " (", sql_name(time), ")"}));
        sql.push_back(create_view(view));
        sql.push_back(
            joined({"INSERT INTO gpkg_contents (table_name, data_type, identifier, description, ",
                    "last_change, min_x, min_y, max_x, max_y, srs_id) SELECT ", sql_text(view.name),
                    ", 'features', ", sql_text(view.name), ", ", sql_text(view.view->title), ", ",
                    sql_text(with_milliseconds(job.set->now)),
                    ", min_x, min_y, max_x, max_y, srs_id FROM gpkg_contents WHERE table_name = ",
                    points}));
        sql.push_back(joined({"INSERT INTO gpkg_geometry_columns (table_name, column_name, "
                              "geometry_type_name, srs_id, z, m) SELECT ",
                              sql_text(view.name),
                              ", column_name, geometry_type_name, srs_id, z, m FROM "
                              "gpkg_geometry_columns WHERE table_name = ",
                              points}));
    }
    return sql;
}

} // namespace rillstrand::geo::writing

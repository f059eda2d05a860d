// SPDX-License-Identifier: Apache-2.0
#include "layers_rtree.hpp"

#include "layers_gpkg_tables.hpp"

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>

namespace rillstrand::geo::writing {

namespace {
constexpr std::size_t most_cells = 51;
constexpr std::size_t cell_bytes = 24;
constexpr std::size_t node_bytes = 4 + most_cells * cell_bytes;
constexpr std::size_t rows_a_statement = 1000;

/// A box that may lose no part of the other one when its edges become floats.
using FloatBox = std::array<float, 4>;

float not_above(double value) {
    const auto rounded = static_cast<float>(value);
    return static_cast<double>(rounded) > value
               ? std::nextafter(rounded, -std::numeric_limits<float>::infinity())
               : rounded;
}

float not_below(double value) {
    return -not_above(-value);
}

struct Cell {
    std::int64_t number = 0; ///< row in a leaf, node elsewhere
    FloatBox box{};
};

FloatBox around(const std::vector<Cell>& cells, std::size_t from, std::size_t to) {
    FloatBox box = cells[from].box;
    for (std::size_t i = from + 1; i < to; ++i) {
        box[0] = std::min(box[0], cells[i].box[0]);
        box[1] = std::max(box[1], cells[i].box[1]);
        box[2] = std::min(box[2], cells[i].box[2]);
        box[3] = std::max(box[3], cells[i].box[3]);
    }
    return box;
}

template <typename Unsigned> void add_big_endian(std::string& out, Unsigned value) {
    for (std::size_t i = sizeof(Unsigned); i-- > 0;)
        out += static_cast<char>(static_cast<unsigned char>(value >> (8U * i)));
}

std::string node_of(const std::vector<Cell>& cells, std::size_t from, std::size_t to,
                    std::uint16_t depth) {
    std::string node;
    node.reserve(node_bytes);
    add_big_endian(node, depth);
    add_big_endian(node, static_cast<std::uint16_t>(to - from));
    for (std::size_t i = from; i < to; ++i) {
        add_big_endian(node, static_cast<std::uint64_t>(cells[i].number));
        for (const float edge : cells[i].box)
            add_big_endian(node, std::bit_cast<std::uint32_t>(edge));
    }
    node.resize(node_bytes, '\0');
    return node;
}

std::string hexadecimal(const std::string& bytes) {
    constexpr std::string_view digits = "0123456789ABCDEF";
    std::string text;
    text.reserve(2 * bytes.size());
    for (const char c : bytes) {
        const auto byte = static_cast<unsigned char>(c);
        text += digits[byte >> 4U];
        text += digits[byte & 15U];
    }
    return text;
}

/// `INSERT INTO table VALUES (...), (...)` in statements of a bearable length.
void add_inserts(std::vector<std::string>& sql, const std::string& table,
                 const std::vector<std::string>& rows) {
    for (std::size_t from = 0; from < rows.size(); from += rows_a_statement) {
        std::string statement = "INSERT INTO " + sql_name(table) + " VALUES ";
        const std::size_t to = std::min(rows.size(), from + rows_a_statement);
        for (std::size_t i = from; i < to; ++i) {
            if (i > from)
                statement += ',';
            statement += rows[i];
        }
        sql.push_back(std::move(statement));
    }
}

/// `(a,b)`.
std::string pair_of(std::int64_t a, const std::string& b) {
    std::string text = "(";
    text += std::to_string(a);
    text += ',';
    text += b;
    text += ')';
    return text;
}

void add_content(std::vector<std::string>& sql, const std::string& tree,
                 const std::vector<BoxedRow>& rows) {
    if (rows.empty())
        return; // the module's own empty root stands
    const PackedTree packed = pack_tree(rows);
    std::vector<std::string> nodes, leaves, parents;
    for (std::size_t i = 0; i < packed.nodes.size(); ++i) {
        const auto number = static_cast<std::int64_t>(i) + 1;
        nodes.push_back(pair_of(number, "x'" + hexadecimal(packed.nodes[i]) + "'"));
        if (i > 0)
            parents.push_back(pair_of(number, std::to_string(packed.parent[i])));
    }
    for (std::size_t i = 0; i < rows.size(); ++i)
        leaves.push_back(pair_of(rows[i].row, std::to_string(packed.leaf_of_row[i])));
    sql.push_back("DELETE FROM " + sql_name(tree + "_node"));
    add_inserts(sql, tree + "_node", nodes);
    add_inserts(sql, tree + "_rowid", leaves);
    add_inserts(sql, tree + "_parent", parents);
}

/// The six triggers of annex F.3, that keep the index right when the table is edited.
void add_triggers(std::vector<std::string>& sql, const std::string& table,
                  const std::string& geometry, const std::string& key, const std::string& tree) {
    const std::string t = sql_name(table), g = sql_name(geometry), k = sql_name(key),
                      r = sql_name(tree);
    const std::string there = "(NEW." + g + " NOTNULL AND NOT ST_IsEmpty(NEW." + g + "))";
    const std::string gone = "(NEW." + g + " ISNULL OR ST_IsEmpty(NEW." + g + "))";
    const std::string put = "INSERT OR REPLACE INTO " + r + " VALUES (NEW." + k + ",ST_MinX(NEW." +
                            g + "), ST_MaxX(NEW." + g + "),ST_MinY(NEW." + g + "), ST_MaxY(NEW." +
                            g + ")); ";
    const std::string take = "DELETE FROM " + r + " WHERE id = OLD." + k + "; ";
    const std::string same = "OLD." + k + " = NEW." + k + " AND ";
    const std::string other = "OLD." + k + " != NEW." + k + " AND ";
    const auto add = [&](const std::string& name, const std::string& event,
                         const std::string& condition, const std::string& action) {
        sql.push_back("CREATE TRIGGER " + sql_name(tree + name) + " AFTER " + event + " ON " + t +
                      " WHEN " + condition + " BEGIN " + action + "END");
    };
    add("_insert", "INSERT", "(new." + g + " NOT NULL AND NOT ST_IsEmpty(NEW." + g + "))", put);
    add("_update1", "UPDATE OF " + g, same + there, put);
    add("_update2", "UPDATE OF " + g, same + gone, take);
    add("_update3", "UPDATE", other + there, take + put);
    add("_update4", "UPDATE", other + gone,
        "DELETE FROM " + r + " WHERE id IN (OLD." + k + ", NEW." + k + "); ");
    add("_delete", "DELETE", "old." + g + " NOT NULL", take);
}
} // namespace

PackedTree pack_tree(const std::vector<BoxedRow>& rows) {
    std::vector<Cell> cells;
    cells.reserve(rows.size());
    for (const auto& row : rows)
        cells.push_back({row.row,
                         {not_above(row.box[0]), not_below(row.box[1]), not_above(row.box[2]),
                          not_below(row.box[3])}});
    PackedTree tree;
    tree.nodes.resize(1); // the root is node 1 and is written last
    tree.parent.resize(1);
    std::uint16_t depth = 0;
    for (; cells.size() > most_cells; ++depth) {
        std::vector<Cell> above;
        for (std::size_t from = 0; from < cells.size(); from += most_cells) {
            const std::size_t to = std::min(cells.size(), from + most_cells);
            tree.nodes.push_back(node_of(cells, from, to, 0));
            tree.parent.push_back(0);
            const auto number = static_cast<std::int64_t>(tree.nodes.size());
            for (std::size_t i = from; i < to; ++i)
                if (depth == 0)
                    tree.leaf_of_row.push_back(number);
                else
                    tree.parent[static_cast<std::size_t>(cells[i].number) - 1] = number;
            above.push_back({number, around(cells, from, to)});
        }
        cells = std::move(above);
    }
    tree.nodes.front() = node_of(cells, 0, cells.size(), depth);
    for (const auto& cell : cells)
        if (depth == 0)
            tree.leaf_of_row.push_back(1);
        else
            tree.parent[static_cast<std::size_t>(cell.number) - 1] = 1;
    return tree;
}

std::vector<std::string> tree_statements(const std::string& table, const std::string& geometry,
                                         const std::string& key,
                                         const std::vector<BoxedRow>& rows) {
    const std::string tree = "rtree_" + table + "_" + geometry;
    std::vector<std::string> sql{"CREATE VIRTUAL TABLE " + sql_name(tree) +
                                 " USING rtree(id, minx, maxx, miny, maxy)"};
    add_content(sql, tree, rows);
    add_triggers(sql, table, geometry, key, tree);
    sql.push_back("INSERT INTO gpkg_extensions VALUES (" + sql_text(table) + ", " +
                  sql_text(geometry) +
                  ", 'gpkg_rtree_index', 'http://www.geopackage.org/spec130/#extension_rtree', "
                  "'write-only')");
    return sql;
}

} // namespace rillstrand::geo::writing

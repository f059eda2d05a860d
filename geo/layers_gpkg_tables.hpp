// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "layers_write.hpp"

#include <string>
#include <vector>

/// The tables of a GeoPackage that OGR does not write by itself, as SQL statements.
/// Source: OGC 12-128r17, GeoPackage Encoding Standard 1.3, annexes C and F.
namespace rillstrand::geo::writing {

/// A style and the column of geometries it is for.
struct PlacedStyle {
    LayerStyle style;
    std::string geometry_column;
};

/// Text as an SQL literal, and a name as an SQL identifier.
std::string sql_text(std::string_view text);
std::string sql_name(std::string_view name);

/// A name that no column of the table has, like the one wanted.
std::string free_name(const Table& table, const std::string& wanted);

/// `2031-04-05T06:07:08Z` as the standard writes it, with milliseconds.
std::string with_milliseconds(std::string time);

/// One sentence on a layer for gpkg_contents: what it is and what of.
std::string described(const LayerSet& set, const Named& named);

/// Styles of all layers with geometry and of all views.
std::vector<PlacedStyle> styles_of(const Job& job);

/// gpkg_data_columns (titles and units of fields) and gpkg_metadata (title, summary, creator,
/// licence, provenance; once for the file and once a layer).
std::vector<std::string> description_statements(const Job& job);

/// The R-tree of a layer's geometries, packed, its triggers and its extension row.
std::vector<std::string> index_statements(const Named& named);

/// The views that put a table's rows on points, registered as layers of features.
std::vector<std::string> view_statements(const Job& job);

} // namespace rillstrand::geo::writing

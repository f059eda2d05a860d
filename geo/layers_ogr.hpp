// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "layers.hpp"
#include "layers_gdal.hpp"

#include <ogrsf_frmts.h>

#include <memory>
#include <string>
#include <vector>

namespace rillstrand::geo::writing {

/// OGR's name for a kind of geometry.
OGRwkbGeometryType ogr_type(GeometryKind kind);

/// A field for a column, under a name of the format's choice.
std::unique_ptr<OGRFieldDefn> ogr_field(const Column& column, const std::string& name);

/// Sets one cell: NULL where missing.
void set_cell(OGRFeature& feature, int field, const Column& column, std::size_t row);

/// A geometry of a row, or nothing where it is missing.
std::unique_ptr<OGRGeometry> ogr_geometry(const Layer& layer, std::size_t row, bool with_z = true);

/// Calendar date of `YYYY-MM-DD`; false if the text is none.
bool parse_date(const std::string& text, int& year, int& month, int& day);

/// Adds every row of a table to a layer whose fields are those of the table, in order.
/// @return false as soon as a row cannot be written
bool add_rows(OGRLayer& target, const Layer& layer);

} // namespace rillstrand::geo::writing

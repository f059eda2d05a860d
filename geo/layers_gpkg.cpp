// SPDX-License-Identifier: Apache-2.0
#include "layers_gdal.hpp"
#include "layers_gpkg_tables.hpp"
#include "layers_ogr.hpp"
#include "layers_write.hpp"

#include <ogrsf_frmts.h>

#include <system_error>
#include <vector>

namespace rillstrand::geo::writing {

namespace {
OGRLayer* add_layer(GDALDataset& file, const Job& job, const Named& named,
                    OGRSpatialReference& crs) {
    GdalOptions options;
    options.add("FID=" + free_name(named.table(), "fid"));
    options.add("GEOMETRY_NAME=" + free_name(named.table(), "geom"));
    options.add("IDENTIFIER=" + named.name);
    options.add("DESCRIPTION=" + described(*job.set, named));
    options.add("SPATIAL_INDEX=NO"); // added below, packed
    OGRLayer* layer = file.CreateLayer(named.name.c_str(), named.has_geometry() ? &crs : nullptr,
                                       ogr_type(named.layer->geometry), options.get());
    if (layer == nullptr)
        return nullptr;
    for (const auto& column : named.table().columns()) {
        const auto field = ogr_field(column, column.name);
        if (layer->CreateField(field.get()) != OGRERR_NONE)
            return nullptr;
    }
    return add_rows(*layer, *named.layer) ? layer : nullptr;
}

void add_styles(GDALDataset& file, const Job& job) {
    GdalOptions options{"FID=id", "IDENTIFIER=layer_styles",
                        "DESCRIPTION=How GIS programs draw the layers"};
    OGRLayer* layer = file.CreateLayer("layer_styles", nullptr, wkbNone, options.get());
    if (layer == nullptr)
        return;
    const auto add_text_field = [&](const char* name, int width) {
        OGRFieldDefn field{name, OFTString};
        field.SetWidth(width);
        layer->CreateField(&field);
    };
    for (const char* name :
         {"f_table_catalog", "f_table_schema", "f_table_name", "f_geometry_column"})
        add_text_field(name, 256);
    add_text_field("styleName", 30);
    add_text_field("styleQML", 0);
    add_text_field("styleSLD", 0);
    OGRFieldDefn as_default{"useAsDefault", OFTInteger};
    as_default.SetSubType(OFSTBoolean);
    layer->CreateField(&as_default);
    add_text_field("description", 0);
    add_text_field("owner", 30);
    add_text_field("ui", 30);
    OGRFieldDefn updated{"update_time", OFTDateTime};
    layer->CreateField(&updated);
    for (const auto& style : styles_of(job)) {
        OGRFeature row{layer->GetLayerDefn()};
        row.SetField("f_table_catalog", "");
        row.SetField("f_table_schema", "");
        row.SetField("f_table_name", style.style.layer.c_str());
        row.SetField("f_geometry_column", style.geometry_column.c_str());
        row.SetField("styleName", style.style.layer.substr(0, 30).c_str());
        row.SetField("styleQML", to_qml(style.style).c_str());
        row.SetField("styleSLD", to_sld(style.style).c_str());
        row.SetField("useAsDefault", 1);
        row.SetField("description", utf8(style.style.title).c_str());
        row.SetField("owner", "");
        row.SetField("update_time", job.set->now.c_str());
        if (layer->CreateFeature(&row) != OGRERR_NONE)
            return;
    }
}

void run_all(GDALDataset& file, const std::vector<std::string>& statements,
             const GdalFailures& failures) {
    for (const auto& statement : statements) {
        if (OGRLayer* result = file.ExecuteSQL(statement.c_str(), nullptr, nullptr))
            file.ReleaseResultSet(result);
        if (failures.any())
            return;
    }
}

void fill(GDALDataset& file, const Job& job, const GdalFailures& failures) {
    OGRSpatialReference crs;
    if (!job.set->crs.empty())
        crs = coordinate_system(job.set->crs);
    if (file.StartTransaction() != OGRERR_NONE)
        return;
    for (const auto& named : job.layers)
        if (add_layer(file, job, named, crs) == nullptr || failures.any())
            return;
    add_styles(file, job);
    if (failures.any() || file.CommitTransaction() != OGRERR_NONE)
        return;
    file.FlushCache(); // contents and extents are in the file before views and indexes lean on them
    if (failures.any() || file.StartTransaction() != OGRERR_NONE)
        return;
    run_all(file, description_statements(job), failures);
    for (const auto& named : job.layers)
        if (named.has_geometry() && !failures.any())
            run_all(file, index_statements(named), failures);
    run_all(file, view_statements(job), failures);
    if (!failures.any())
        file.CommitTransaction();
}
} // namespace

void write_gpkg(const Job& job, WrittenLayers& written) {
    const auto path = job.folder / "layers.gpkg";
    std::error_code ignored;
    std::filesystem::remove(path, ignored);
    // The run's clock, not the library's; the file is flushed by whoever moves it into place.
    const GdalOption clock{"OGR_CURRENT_DATE", with_milliseconds(job.set->now)};
    const GdalOption no_flush{"OGR_SQLITE_SYNCHRONOUS", "OFF"};
    const GdalOption no_journal{"OGR_SQLITE_JOURNAL", "MEMORY"};
    const GdalOption no_sidecar{"GDAL_PAM_ENABLED", "NO"};
    GdalFailures failures;
    GdalOptions options{"VERSION=1.3"};
    Dataset file{driver("GPKG")->Create(path.c_str(), 0, 0, 0, GDT_Unknown, options.get())};
    if (!file)
        failures.give_up(path);
    fill(*file, job, failures);
    file.reset();
    failures.throw_if_any(path);
    written.files.emplace_back("layers.gpkg");
    for (const auto& style : styles_of(job)) {
        const auto name = std::filesystem::path{"layers"} / (style.style.layer + ".sld");
        write_text(job.folder / name, to_sld(style.style));
        written.files.push_back(name);
    }
}

} // namespace rillstrand::geo::writing

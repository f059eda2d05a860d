// SPDX-License-Identifier: Apache-2.0
#include "layers_gdal.hpp"
#include "layers_ogr.hpp"
#include "layers_write.hpp"

#include <ogrsf_frmts.h>

#include <algorithm>
#include <system_error>

namespace rillstrand::geo::writing {

namespace {
/// The library writes no row without a geometry in this format: they are told, not lost in silence.
void warn_of_missing(const Named& named, WrittenLayers& written) {
    const auto missing =
        std::count_if(named.layer->vertices.begin(), named.layer->vertices.end(),
                      [&](const auto& row) { return is_missing(*named.layer, row); });
    if (missing > 0)
        written.warnings.push_back(
            {"flatgeobuf-rows-left-out",
             "layers/" + named.name + ".fgb: " + std::to_string(missing) +
                 " rows without a position are left out; take them from layers.gpkg"});
}

void fill(GDALDataset& file, const Job& job, const Named& named) {
    OGRSpatialReference crs;
    if (!job.set->crs.empty())
        crs = coordinate_system(job.set->crs);
    OGRLayer* layer = file.CreateLayer(named.name.c_str(), &crs, ogr_type(named.layer->geometry));
    if (layer == nullptr)
        return;
    for (const auto& column : named.table().columns()) {
        const auto field = ogr_field(column, column.name);
        if (layer->CreateField(field.get()) != OGRERR_NONE)
            return;
    }
    add_rows(*layer, *named.layer);
}
} // namespace

void write_flatgeobuf(const Job& job, WrittenLayers& written) {
    for (const auto& named : job.layers) {
        if (!named.has_geometry())
            continue;
        const auto name = std::filesystem::path{"layers"} / (named.name + ".fgb");
        const auto path = job.folder / name;
        std::error_code ignored;
        std::filesystem::remove(path, ignored);
        const GdalFailures failures;
        Dataset file{driver("FlatGeobuf")->Create(path.c_str(), 0, 0, 0, GDT_Unknown, nullptr)};
        if (!file)
            failures.give_up(path);
        fill(*file, job, named);
        file.reset();
        failures.throw_if_any(path);
        written.files.push_back(name);
        warn_of_missing(named, written);
    }
    warn_of_tables(job, "layers/*.fgb", written);
}

} // namespace rillstrand::geo::writing

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "layers.hpp"

#include <ogrsf_frmts.h>

#include <filesystem>
#include <functional>
#include <memory>
#include <string>

/// Reads written layers back with OGR and compares them.
namespace rillstrand::geo::reread {

struct Close {
    void operator()(GDALDataset* dataset) const { GDALClose(dataset); }
};
using File = std::unique_ptr<GDALDataset, Close>;

/// Opens a vector file with every driver of GDAL; the options are its open options.
File open(const std::filesystem::path& path, const std::vector<std::string>& options = {});

/// What a format keeps of a layer.
struct Promise {
    double degrees = 0.0;      ///< positions are longitude and latitude within this, else x, y
    double metres = 1e-9;      ///< positions are x, y within this; heights in any case
    bool heights = true;       ///< heights are kept
    bool unplaced_rows = true; ///< rows without a place are kept
    bool types = true;         ///< dates, times and booleans have types of their own
    bool order = true;         ///< rows come in their order, else told apart by the first column
    double relative = 0.0;     ///< error of numbers
    std::function<std::string(const std::string&)> field_name; ///< absent: names as they are
};

/// CHECKs every row, cell and position of a layer against what was written.
void check_layer(GDALDataset& file, const std::string& name, const Layer& written,
                 const Promise& promise);

} // namespace rillstrand::geo::reread

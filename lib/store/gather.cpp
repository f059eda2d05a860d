// SPDX-License-Identifier: Apache-2.0
#include "store/gather.hpp"

#include "base/text.hpp"
#include "record/row_order.hpp"
#include "record/text_input.hpp"
#include "store/canonical.hpp"
#include "store/grid_gather.hpp"

#include <algorithm>
#include <fstream>
#include <optional>
#include <utility>

namespace rillstrand::store {

namespace {

namespace fs = std::filesystem;

/// A folder that holds a Zarr store, or a file that begins as NetCDF-3 or HDF5 files do.
bool is_grid(const fs::path& file) {
    std::error_code ignored;
    if (fs::is_directory(file, ignored))
        return true;
    std::array<char, 4> head{};
    std::ifstream in{file, std::ios::binary};
    in.read(head.data(), head.size());
    const std::string_view magic{head.data(), head.size()};
    return magic.substr(0, 3) == "CDF" || magic == "\x89HDF";
}

struct Files {
    std::vector<fs::path> list;
    bool grid = false;
};

/// Zarr stores are folders: a pattern that names one is no pattern of files.
Files files_of(const campaign::Campaign& campaign) {
    Files files;
    files.list = record::find_files(campaign.record.files, campaign.folder);
    if (campaign.record.layout == campaign::Layout::grid) {
        files.grid = true;
        return files;
    }
    const auto grids = std::count_if(files.list.begin(), files.list.end(), is_grid);
    if (grids == 0)
        return files;
    const bool told = campaign.record.layout == campaign::Layout::told_from_file;
    if (!told || static_cast<std::size_t>(grids) != files.list.size()) {
        const auto first = std::find_if(files.list.begin(), files.list.end(), is_grid);
        throw DataError{first->string() + ": is a grid (NetCDF or Zarr), but " +
                        (told ? "other files of the record are text; give files of one layout"
                              : "record.layout says text; say record.layout = \"grid\"")};
    }
    files.grid = true;
    return files;
}

std::string words(campaign::Layout layout) {
    switch (layout) {
    case campaign::Layout::wide:
        return "wide text";
    case campaign::Layout::tall:
        return "tall text";
    case campaign::Layout::single:
        return "a text file a trace";
    case campaign::Layout::grid:
        return "grid";
    case campaign::Layout::told_from_file:
        break;
    }
    return "text";
}

} // namespace

Inspection inspect(const campaign::Campaign& campaign) {
    const Files files = files_of(campaign);
    return files.grid ? inspect_grids(campaign.record, files.list)
                      : record::inspect_text(campaign.record, files.list);
}

GatherReport gather(const campaign::Campaign& campaign, const fs::path& record_nc,
                    const std::string& history, Progress& progress) {
    const Files files = files_of(campaign);
    std::optional<CanonicalWriter> writer;
    const auto make_sink = [&](const record::RecordHead& head) -> record::Sink& {
        CanonicalHead canonical;
        canonical.distance_m = head.distance_m;
        canonical.quantities = head.quantities;
        canonical.interval_s = head.interval_s;
        canonical.source =
            std::to_string(files.list.size()) + (files.list.size() == 1 ? " file (" : " files (") +
            words(files.grid ? campaign::Layout::grid : campaign.record.layout) + ")";
        canonical.history = history;
        return writer.emplace(record_nc, std::move(canonical));
    };
    GatherReport report = files.grid
                              ? gather_grids(campaign.record, files.list, make_sink, progress)
                              : record::gather_text(campaign.record, files.list,
                                                    record_nc.parent_path(), make_sink, progress);
    if (!writer)
        throw DataError{"record: no trace was found in the files of record.files"};
    writer->finish();
    return report;
}

} // namespace rillstrand::store

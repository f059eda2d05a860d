// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "base/progress.hpp"
#include "campaign/campaign.hpp"
#include "record/cells.hpp"
#include "record/source.hpp"
#include "record/text_head.hpp"

#include <filesystem>
#include <functional>
#include <string>
#include <vector>

namespace rillstrand::record {

/// A stretch of time without traces, longer than 1.5 intervals.
struct Gap {
    double from_s = 0.0; ///< last trace before
    double to_s = 0.0;   ///< first trace after
};

/// What was read, for the findings.
struct GatherReport {
    campaign::Layout layout = campaign::Layout::told_from_file;
    std::vector<std::filesystem::path> files;
    std::int64_t traces = 0;
    std::int64_t duplicates = 0; ///< traces that came twice
    double interval_s = 0.0;
    bool interval_told = false; ///< told from the stamps
    CellCounts cells;
    std::vector<Gap> gaps;
    Warnings warnings;
};

/// What the sink must know before the first row.
struct RecordHead {
    Eigen::ArrayXd distance_m;
    std::vector<Quantity> quantities; ///< temperature first
    std::int64_t traces = 0;          ///< upper bound
    double interval_s = 0.0;
};
using MakeSink = std::function<Sink&(const RecordHead&)>;

/// What the heads of the files say, for `check`.
struct Inspection {
    campaign::Layout layout = campaign::Layout::told_from_file;
    std::vector<std::filesystem::path> files;
    Eigen::ArrayXd distance_m; ///< empty where a head does not tell (tall)
};

/// Reads the heads of text files only.
/// @throws DataError with all problems of all files
Inspection inspect_text(const campaign::Record& record,
                        const std::vector<std::filesystem::path>& files);

/// Reads a record of text files of one layout and hands it on row by row in order of time: stamps
/// in UTC at the middle of the averaging interval, temperatures in degC. Memory is bounded by a few
/// traces and an index of rows, whatever the size of the record.
/// @param scratch  folder for temporary files (gzip tables, tall tables in disorder)
/// @throws DataError naming file and line
GatherReport gather_text(const campaign::Record& record,
                         const std::vector<std::filesystem::path>& files,
                         const std::filesystem::path& scratch, const MakeSink& make_sink,
                         Progress& progress);

} // namespace rillstrand::record

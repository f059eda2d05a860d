// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/gather.hpp"
#include "record/stamps.hpp"

namespace rillstrand::record {

/// What the gatherers of the three text layouts share.
struct TextJob {
    const campaign::Record& record;
    const std::vector<TextHead>& heads;
    const StampReader& stamps;
    const std::filesystem::path& scratch;
    const MakeSink& make_sink;
    Progress& progress;
    GatherReport& report;
};

void gather_single(const TextJob& job);
void gather_wide(const TextJob& job);
void gather_tall(const TextJob& job);

/// @throws DataError with `file:line: ` before the text
[[noreturn]] void refuse(const std::filesystem::path& file, std::size_t line,
                         const std::string& what);

/// Reads a stamp and puts file and line before what is wrong with it.
double read_stamp(const StampReader& stamps, std::string_view stamp,
                  std::optional<double> previous_s, const std::filesystem::path& file,
                  std::size_t line);

} // namespace rillstrand::record

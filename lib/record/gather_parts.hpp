// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/gather.hpp"
#include "record/stamps.hpp"

#include <string_view>
#include <vector>

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

/// @throws DataError with `file:line: ` before the text; line 0: the file alone
[[noreturn]] void refuse(const std::filesystem::path& file, std::size_t line,
                         const std::string& what);

/// The sentence about a row that has not as many cells as its header.
std::string ragged(std::size_t cells, std::size_t needed);

/// The sentence about a cell that is no number.
std::string no_number(std::string_view cell, const std::string& what, char decimal);

/// Reads the stamp of a row; what is wrong with it has file and line before it.
double read_stamp(const StampReader& stamps, ClockSequence& sequence, std::string_view stamp,
                  const std::filesystem::path& file, std::size_t line);

/// Warns of files whose distances fall and were turned round.
void tell_reversed(std::size_t files, GatherReport& report);

} // namespace rillstrand::record

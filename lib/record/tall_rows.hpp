// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/gather_parts.hpp"

#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// Rows of a tall table in a row that have one stamp.
struct TallGroup {
    std::string_view stamp;
    std::size_t first = 0; ///< of the block's rows
    std::size_t count = 0;
};

/// The rows of one block of a tall table.
struct TallBlock {
    std::string text;
    std::vector<TallGroup> groups;
    std::vector<double> distance_m;
    std::vector<float> values;       ///< quantity fastest: temperature, then powers
    std::vector<std::uint32_t> line; ///< of each row, from 0 in the block
    std::size_t lines = 0;
    CellCounts counts;
    std::string wrong; ///< of line `wrong_line`, with what was read before it
    std::size_t wrong_line = 0;
};

/// Goes through the rows of one file of a tall record in order, blocks being parsed several at a
/// time.
/// @param use  called for each group with its block and the number of the block's first line
/// @return what became of the cells
/// @throws DataError naming file and line
CellCounts each_group(
    const TextJob& job, const TextHead& head,
    const std::function<void(const TallBlock&, const TallGroup&, std::size_t first_line)>& use);

} // namespace rillstrand::record

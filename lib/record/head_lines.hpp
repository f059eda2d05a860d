// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <filesystem>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// The first lines of a text file.
struct HeadLines {
    struct Line {
        std::size_t number = 0;
        std::string text;
    };
    std::vector<std::string> preamble; ///< comments and skipped lines, where a stamp may stand
    std::vector<Line> lines;           ///< others: up to 64, at least three where there are so many
};

/// @throws DataError if the file holds no line that could be a header or a row
HeadLines read_head_lines(const std::filesystem::path& file, const campaign::RecordText& options);

/// The delimiter that the last of the lines tells: tab, `;`, `|`, `,` or blanks, in this order. A
/// comma that is the decimal mark is none.
char tell_delimiter(const HeadLines& head, const campaign::RecordText& options);

/// Whether a line carries no data: blank or a comment.
bool is_comment(std::string_view line, const campaign::RecordText& options);

} // namespace rillstrand::record

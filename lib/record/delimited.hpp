// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// A small delimited text table with a header, all in memory: tie points, control points, side
/// series. Delimiter and decimal comma are told from the file; lines that begin with # are
/// comments.
struct Delimited {
    std::filesystem::path file;
    std::vector<std::string> header;
    std::vector<std::vector<std::string>> rows; ///< each as long as the header
    std::vector<std::size_t> lines;             ///< line number of each row
    bool decimal_comma = false;

    /// Position of a column by its name, without regard to capitals and blanks around.
    std::optional<std::size_t> column(const std::string& name) const;
    /// `file:line`
    std::string place(std::size_t row) const;
    std::string place_of(std::size_t line) const;
    /// The number in a cell; nothing where the cell is empty, `nan` or `NA`.
    /// @throws DataError with file, line and text if it is anything else
    std::optional<double> number(std::size_t row, std::size_t cell) const;
};

/// The delimiter that a header of names tells: tab, `;`, `|`, `,` or blanks, in this order.
char tell_table_delimiter(std::string_view header);

/// @throws DataError if the file is missing, empty, no text, has over 20,000,000 rows, or a row is
///         ragged
Delimited read_delimited(const std::filesystem::path& file);

} // namespace rillstrand::record

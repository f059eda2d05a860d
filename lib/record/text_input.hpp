// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <filesystem>
#include <memory>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// Paths that match the patterns (`*`, `?`, `[…]`) of a list, sorted, each once.
/// @throws DataError naming each pattern that matches nothing
std::vector<std::filesystem::path> find_files(const std::vector<std::string>& patterns,
                                              const std::filesystem::path& folder);

/// Lines of a text file, plain or gzip, whatever its line ends; a byte-order mark is passed over.
class LineSource {
public:
    /// @throws DataError if the file cannot be opened, is a folder, or is UTF-16
    explicit LineSource(std::filesystem::path file);
    LineSource(const LineSource&) = delete;
    LineSource& operator=(const LineSource&) = delete;
    LineSource(LineSource&&) noexcept;
    LineSource& operator=(LineSource&&) noexcept;
    ~LineSource();

    /// The next line without its end; valid until the next call.
    /// @return false at the end of the file
    /// @throws DataError if the bytes are no text (a zero byte), the gzip stream is cut short, or a
    ///         line is longer than 64 MB
    bool next(std::string_view& line);
    /// Number of the line that `next` gave last, from 1.
    std::size_t number() const;
    /// Unpacked bytes before the line that `next` gave last.
    std::size_t offset() const;
    const std::filesystem::path& file() const;

private:
    struct Data;
    std::unique_ptr<Data> m_data;
};

/// The whole text of a file, unpacked.
/// @param largest  refuse beyond so many bytes
std::string read_text(const std::filesystem::path& file, std::size_t largest);

/// Cells of one line; ' ' as delimiter means runs of blanks and tabs. Quotation marks around a cell
/// are taken off.
void split_cells(std::string_view line, char delimiter, std::vector<std::string_view>& cells);

std::string_view trim(std::string_view text);

} // namespace rillstrand::record

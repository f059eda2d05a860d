// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/byte_source.hpp"
#include "record/find_files.hpp"

#include <filesystem>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// Longest line of a text file that is taken: a row of a million columns fits into it.
inline constexpr std::size_t longest_line_bytes = std::size_t{64} << 20U;

/// Text of a file in blocks of whole lines, plain or gzip; a byte-order mark is passed over.
class BlockSource {
public:
    /// @param block_bytes  aim of a block's size; a longer line makes a larger block
    /// @throws DataError if the file cannot be opened or is UTF-16
    explicit BlockSource(const std::filesystem::path& file,
                         std::size_t block_bytes = std::size_t{1} << 20U);
    /// The next block: every line in it is whole, line ends included.
    /// @return false at the end of the file
    /// @throws DataError if the bytes are no text (a zero byte), the gzip stream is cut short or
    ///         damaged, or a line is longer than 64 MB
    bool next(std::string& block);
    /// Unpacked bytes before the block that `next` gave last.
    std::uint64_t offset() const { return m_offset; }
    /// Bytes of the file on the disk that have been read.
    std::uint64_t taken() const { return m_bytes.taken(); }

private:
    void check(std::string& block, std::size_t from);
    std::filesystem::path m_file;
    ByteSource m_bytes;
    std::size_t m_block_bytes;
    std::string m_rest; ///< begin of a line whose end was not yet read
    std::uint64_t m_offset = 0;
    std::uint64_t m_next_offset = 0;
    bool m_opened = false;
    bool m_ended = false;
};

/// Takes the line off the front of a text, without its end, whatever that is: `\n`, `\r\n`, `\r`.
/// @param feed  where the next `\n` is known to stand, for texts that have none; begin with nullptr
std::string_view take_line(std::string_view& text, const char*& feed);

/// Lines of a text file.
class LineSource {
public:
    explicit LineSource(const std::filesystem::path& file,
                        std::size_t block_bytes = std::size_t{1} << 20U);
    /// The next line without its end; valid until the next call.
    /// @return false at the end of the file
    /// @throws DataError as BlockSource does
    bool next(std::string_view& line);
    /// Number of the line that `next` gave last, from 1.
    std::size_t number() const { return m_number; }
    /// Unpacked bytes before the line that `next` gave last.
    std::uint64_t offset() const { return m_offset; }
    /// Bytes of the file on the disk that have been read.
    std::uint64_t taken() const { return m_blocks.taken(); }

private:
    BlockSource m_blocks;
    std::string m_block;
    std::string_view m_text; ///< what is left of the block
    const char* m_feed = nullptr;
    std::size_t m_number = 0;
    std::uint64_t m_offset = 0;
};

/// The whole text of a file, unpacked, without a byte-order mark.
/// @param largest_bytes  refuse beyond so many
/// @param text           is overwritten; keeps its memory from file to file
void read_text(const std::filesystem::path& file, std::size_t largest_bytes, std::string& text);

/// Cells of one line; ' ' as delimiter means runs of blanks and tabs. Quotation marks around a cell
/// are taken off; doubled ones inside it are left doubled.
/// @param most  stop after so many cells: `cells` then has one more than `most`
void split_cells(std::string_view line, char delimiter, std::vector<std::string_view>& cells,
                 std::size_t most = 1000000);

std::string_view trim(std::string_view text);

} // namespace rillstrand::record

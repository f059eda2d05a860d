// SPDX-License-Identifier: Apache-2.0
#include "record/text_input.hpp"

#include "base/error.hpp"

#include <algorithm>
#include <cstring>

namespace fs = std::filesystem;

namespace rillstrand::record {

namespace {

constexpr std::string_view byte_order_mark = "\xEF\xBB\xBF";

[[noreturn]] void refuse_zero_bytes(const fs::path& file) {
    throw DataError{file.string() +
                    ": holds zero bytes, so it is not text in UTF-8; give a text file, or "
                    "record.layout = \"grid\" for NetCDF"};
}

/// @throws DataError if the text begins as UTF-16 does; whose zero bytes would say less
void refuse_utf16(const fs::path& file, std::string_view text) {
    if (text.substr(0, 2) == "\xFF\xFE" || text.substr(0, 2) == "\xFE\xFF")
        throw DataError{file.string() + ": is text in UTF-16; save it as UTF-8"};
}

/// Bytes up to the end of the last whole line. A carriage return at the very end does not count:
/// its line feed may come next.
std::size_t whole_lines(std::string_view text) {
    const std::size_t feed = text.rfind('\n');
    const std::size_t from = feed == std::string_view::npos ? 0 : feed + 1;
    const std::string_view behind = text.substr(from);
    if (behind.size() < 2)
        return from;
    const std::size_t carriage = behind.rfind('\r', behind.size() - 2);
    return carriage == std::string_view::npos ? from : from + carriage + 1;
}

} // namespace

BlockSource::BlockSource(const fs::path& file, std::size_t block_bytes)
    : m_file{file}, m_bytes{file}, m_block_bytes{block_bytes} {
    if (!m_bytes.packed())
        m_block_bytes = std::min<std::size_t>(m_block_bytes, m_bytes.size() + 64);
}

void BlockSource::check(std::string& block, std::size_t from) {
    if (!m_opened) {
        refuse_utf16(m_file, block);
        m_opened = true;
        if (block.starts_with(byte_order_mark)) {
            block.erase(0, byte_order_mark.size());
            m_next_offset = byte_order_mark.size();
        }
    }
    if (block.find('\0', from) != std::string::npos)
        refuse_zero_bytes(m_file);
}

bool BlockSource::next(std::string& block) {
    m_offset = m_next_offset;
    block.swap(m_rest);
    m_rest.clear();
    std::size_t whole = 0;
    while (whole == 0 && !m_ended) {
        if (block.size() > longest_line_bytes)
            throw DataError{m_file.string() + ": a line is longer than 64 MB; this is no table of "
                                              "text"};
        const std::size_t had = block.size();
        block.resize(had + m_block_bytes);
        const std::size_t got = m_bytes.read(block.data() + had, m_block_bytes);
        block.resize(had + got);
        m_ended = got < m_block_bytes;
        check(block, had);
        m_offset = m_next_offset;
        whole = m_ended ? block.size() : whole_lines(block);
    }
    if (m_ended)
        whole = block.size();
    m_rest = block.substr(whole);
    block.resize(whole);
    m_next_offset = m_offset + whole;
    return whole > 0;
}

std::string_view take_line(std::string_view& text, const char*& feed) {
    const char* begin = text.data();
    const char* end = begin + text.size();
    if (feed == nullptr || feed < begin) {
        const void* found = std::memchr(begin, '\n', text.size());
        feed = found == nullptr ? end : static_cast<const char*>(found);
    }
    const void* found = std::memchr(begin, '\r', static_cast<std::size_t>(feed - begin));
    const char* stop = found == nullptr ? feed : static_cast<const char*>(found);
    const std::string_view line = text.substr(0, static_cast<std::size_t>(stop - begin));
    if (stop == end) {
        text.remove_prefix(text.size());
        return line;
    }
    const bool both = *stop == '\r' && stop + 1 < end && stop[1] == '\n';
    text.remove_prefix(line.size() + (both ? 2 : 1));
    return line;
}

LineSource::LineSource(const fs::path& file, std::size_t block_bytes)
    : m_blocks{file, block_bytes} {}

bool LineSource::next(std::string_view& line) {
    if (m_text.empty()) {
        if (!m_blocks.next(m_block))
            return false;
        m_text = m_block;
        m_feed = nullptr;
    }
    m_offset = m_blocks.offset() + (m_block.size() - m_text.size());
    line = take_line(m_text, m_feed);
    ++m_number;
    return true;
}

void read_text(const fs::path& file, std::size_t largest_bytes, std::string& text) {
    ByteSource bytes{file};
    // One byte more than there is, so that the end of the file is seen in one call.
    std::size_t step = bytes.packed() ? std::size_t{1} << 18U : bytes.size() + 1;
    step = std::min(step, largest_bytes + 1);
    std::size_t filled = 0;
    for (;;) {
        text.resize(filled + step);
        const std::size_t got = bytes.read(text.data() + filled, step);
        filled += got;
        if (got < step)
            break;
        if (filled > largest_bytes)
            throw DataError{file.string() + ": is over " + std::to_string(largest_bytes >> 20U) +
                            " MB unpacked, too large for one trace; see record.layout"};
    }
    text.resize(filled);
    refuse_utf16(file, text);
    if (text.find('\0') != std::string::npos)
        refuse_zero_bytes(file);
    if (text.starts_with(byte_order_mark))
        text.erase(0, byte_order_mark.size());
}

std::string_view trim(std::string_view text) {
    while (!text.empty() && (text.front() == ' ' || text.front() == '\t' || text.front() == '\r'))
        text.remove_prefix(1);
    while (!text.empty() && (text.back() == ' ' || text.back() == '\t' || text.back() == '\r'))
        text.remove_suffix(1);
    return text;
}

namespace {

void split_blanks(std::string_view line, std::vector<std::string_view>& cells, std::size_t most) {
    std::size_t at = 0;
    while (at < line.size() && cells.size() <= most) {
        const std::size_t begin = line.find_first_not_of(" \t", at);
        if (begin == std::string_view::npos)
            break;
        if (line[begin] == '"') {
            const std::size_t close = line.find('"', begin + 1);
            if (close != std::string_view::npos) {
                cells.push_back(line.substr(begin + 1, close - begin - 1));
                at = close + 1;
                continue;
            }
        }
        const std::size_t end = std::min(line.find_first_of(" \t", begin), line.size());
        cells.push_back(line.substr(begin, end - begin));
        at = end;
    }
}

/// The closing quotation mark of a cell; doubled ones are part of it.
std::size_t closing_quote(std::string_view line, std::size_t open) {
    std::size_t at = open + 1;
    for (;;) {
        at = line.find('"', at);
        if (at == std::string_view::npos || at + 1 == line.size() || line[at + 1] != '"')
            return at;
        at += 2;
    }
}

} // namespace

void split_cells(std::string_view line, char delimiter, std::vector<std::string_view>& cells,
                 std::size_t most) {
    cells.clear();
    if (delimiter == ' ') {
        split_blanks(line, cells, most);
        return;
    }
    std::size_t at = 0;
    while (cells.size() <= most) {
        std::size_t end = line.find(delimiter, at);
        std::size_t begin = at;
        while (begin < line.size() && (line[begin] == ' ' || line[begin] == '\t') && begin != end)
            ++begin;
        const bool quoted = begin < line.size() && line[begin] == '"' && begin < end;
        const std::size_t close = quoted ? closing_quote(line, begin) : std::string_view::npos;
        if (close != std::string_view::npos) {
            end = line.find(delimiter, close);
            cells.push_back(line.substr(begin + 1, close - begin - 1));
        } else {
            cells.push_back(trim(line.substr(at, end == std::string_view::npos ? end : end - at)));
        }
        if (end == std::string_view::npos)
            return;
        at = end + 1;
    }
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/head_lines.hpp"

#include "base/error.hpp"
#include "record/columns.hpp"
#include "record/text_input.hpp"

#include <algorithm>

namespace rillstrand::record {

namespace {

constexpr std::size_t head_block_bytes = std::size_t{1} << 16U;
constexpr std::size_t enough_lines = 64, needed_lines = 3;
constexpr std::size_t enough_bytes = std::size_t{1} << 18U;
constexpr std::size_t most_preamble = 1000;
constexpr std::size_t most_passed_lines = 1100000; // skip_lines may be a million

} // namespace

HeadLines read_head_lines(const std::filesystem::path& file, const campaign::RecordText& options) {
    HeadLines head;
    LineSource source{file, head_block_bytes};
    std::string_view line;
    std::size_t bytes = 0;
    int skip = options.skip_lines;
    const auto enough = [&] {
        return head.lines.size() >= enough_lines ||
               (head.lines.size() >= needed_lines && bytes > enough_bytes);
    };
    while (!enough() && source.next(line)) {
        if (source.number() > most_passed_lines) {
            if (!head.lines.empty())
                break;
            throw DataError{file.string() + ": holds no row of numbers in its first 1100000 lines; "
                                            "check what the file is"};
        }
        const bool stamp_line = options.time_from_header && head.lines.empty() &&
                                line.find(*options.time_from_header) != std::string_view::npos;
        if (skip > 0 || stamp_line || is_comment(line, options)) {
            if (skip > 0)
                --skip;
            if (head.preamble.size() < most_preamble)
                head.preamble.emplace_back(line);
        } else {
            head.lines.push_back({source.number(), std::string{line}});
            bytes += line.size();
        }
    }
    if (head.lines.empty())
        throw DataError{file.string() + ": is empty; it holds no row of numbers"};
    return head;
}

char tell_delimiter(const HeadLines& head, const campaign::RecordText& options) {
    const std::string& line = head.lines.back().text;
    for (const char c : {'\t', ';', '|'})
        if (line.find(c) != std::string::npos)
            return c;
    const bool comma_is_decimal = options.decimal && *options.decimal == ',';
    if (comma_is_decimal || line.find(',') == std::string::npos)
        return ' ';
    std::vector<std::string_view> cells;
    split_cells(line, ' ', cells);
    const bool blanks =
        cells.size() > 1 && looks_decimal_comma(cells.back()) &&
        std::count(line.begin(), line.end(), ',') < static_cast<std::ptrdiff_t>(cells.size()) + 1 &&
        head.lines.front().text.find(',') == std::string::npos;
    return blanks ? ' ' : ',';
}

bool is_comment(std::string_view line, const campaign::RecordText& options) {
    const std::string_view text = trim(line);
    return text.empty() || (!options.comment.empty() && text.rfind(options.comment, 0) == 0);
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/delimited.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "record/columns.hpp"
#include "record/text_input.hpp"

#include <algorithm>
#include <cctype>

namespace rillstrand::record {

namespace {

constexpr std::size_t most_rows = 20000000;
constexpr std::size_t most_columns = 10000;

std::string lower(std::string_view text) {
    std::string result{trim(text)};
    std::transform(result.begin(), result.end(), result.begin(),
                   [](unsigned char c) { return static_cast<char>(std::tolower(c)); });
    return result;
}

/// Doubled quotation marks inside a quoted cell stand for one.
std::string unquoted(std::string_view cell) {
    std::string result{cell};
    for (std::size_t at = 0; (at = result.find("\"\"", at)) != std::string::npos; ++at)
        result.erase(at, 1);
    return result;
}

} // namespace

std::optional<std::size_t> Delimited::column(const std::string& name) const {
    const std::string wanted = lower(name);
    for (std::size_t i = 0; i < header.size(); ++i)
        if (header[i] == name)
            return i;
    for (std::size_t i = 0; i < header.size(); ++i)
        if (lower(header[i]) == wanted)
            return i;
    return std::nullopt;
}

std::string Delimited::place(std::size_t row) const {
    return place_of(lines[row]);
}

std::string Delimited::place_of(std::size_t line) const {
    return file.string() + ":" + std::to_string(line);
}

std::optional<double> Delimited::number(std::size_t row, std::size_t cell) const {
    std::string text = rows[row][cell];
    if (text.empty() || text == "nan" || text == "NaN" || text == "NA")
        return std::nullopt;
    if (decimal_comma && text.find('.') == std::string::npos)
        std::replace(text.begin(), text.end(), ',', '.');
    const auto value = text::parse_number(text);
    if (!value)
        throw DataError{place(row) + ": " + header[cell] + " is '" + rows[row][cell] +
                        "', which is no number; correct it or leave it empty"};
    return value;
}

char tell_table_delimiter(std::string_view header) {
    for (const char c : {'\t', ';', '|', ','})
        if (header.find(c) != std::string_view::npos)
            return c;
    return ' ';
}

Delimited read_delimited(const std::filesystem::path& file) {
    Delimited table;
    table.file = file;
    LineSource source{file};
    std::string_view line;
    std::vector<std::string_view> cells;
    char delimiter = ',';
    while (source.next(line)) {
        const std::string_view text = trim(line);
        if (text.empty() || text.front() == '#')
            continue;
        if (table.header.empty()) {
            delimiter = tell_table_delimiter(text);
            split_cells(text, delimiter, cells, most_columns);
            if (cells.size() > most_columns)
                throw DataError{table.place_of(source.number()) +
                                ": has over 10000 columns; this is no side table"};
            for (const auto cell : cells)
                table.header.push_back(unquoted(cell));
            continue;
        }
        split_cells(line, delimiter, cells, table.header.size());
        if (cells.size() != table.header.size())
            throw DataError{table.place_of(source.number()) + ": has " +
                            std::to_string(cells.size()) +
                            (cells.size() == 1 ? " cell" : " cells") + " where the header has " +
                            std::to_string(table.header.size()) + "; complete or remove the line"};
        auto& row = table.rows.emplace_back();
        for (const auto cell : cells) {
            row.push_back(unquoted(cell));
            // With another delimiter than a comma, 12,5 is a number with a decimal comma.
            table.decimal_comma = table.decimal_comma || looks_decimal_comma(cell);
        }
        table.lines.push_back(source.number());
        if (table.rows.size() > most_rows)
            throw DataError{file.string() + ": has over 20000000 rows, too many for a side table"};
    }
    if (table.header.empty())
        throw DataError{file.string() + ": is empty; it needs a header and rows"};
    return table;
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/delimited.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "record/text_input.hpp"

#include <algorithm>
#include <cctype>

namespace rillstrand::record {

namespace {

constexpr std::size_t most_rows = 20000000;

std::string lower(std::string_view text) {
    std::string result{trim(text)};
    std::transform(result.begin(), result.end(), result.begin(),
                   [](unsigned char c) { return static_cast<char>(std::tolower(c)); });
    return result;
}

char tell_delimiter(std::string_view header) {
    for (const char c : {'\t', ';', ','})
        if (header.find(c) != std::string_view::npos)
            return c;
    return ' ';
}

bool comma_number(const std::string& cell) {
    const std::size_t comma = cell.find(',');
    return comma != std::string::npos && comma > 0 &&
           cell.find_first_not_of("0123456789,+-eE") == std::string::npos;
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
    return file.string() + ":" + std::to_string(lines[row]);
}

std::optional<double> Delimited::number(std::size_t row, std::size_t cell) const {
    std::string text = rows[row][cell];
    if (text.empty() || text == "nan" || text == "NaN" || text == "NA")
        return std::nullopt;
    if (decimal_comma)
        std::replace(text.begin(), text.end(), ',', '.');
    const auto value = text::parse_number(text);
    if (!value)
        throw DataError{place(row) + ": " + header[cell] + " is '" + rows[row][cell] +
                        "', which is no number; correct it or leave it empty"};
    return value;
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
            delimiter = tell_delimiter(text);
            split_cells(text, delimiter, cells);
            table.header.assign(cells.begin(), cells.end());
            continue;
        }
        split_cells(delimiter == ' ' ? text : line, delimiter, cells);
        if (cells.size() != table.header.size())
            throw DataError{file.string() + ":" + std::to_string(source.number()) + ": has " +
                            std::to_string(cells.size()) + " cells where the header has " +
                            std::to_string(table.header.size()) + "; complete or remove the line"};
        table.rows.emplace_back(cells.begin(), cells.end());
        table.lines.push_back(source.number());
        if (table.rows.size() > most_rows)
            throw DataError{file.string() + ": has over 20000000 rows, too many for a side table"};
    }
    if (table.header.empty())
        throw DataError{file.string() + ": is empty; it needs a header and rows"};
    if (delimiter != ',' && !table.rows.empty())
        for (const auto& cell : table.rows.front())
            if (comma_number(cell))
                table.decimal_comma = true;
    return table;
}

} // namespace rillstrand::record

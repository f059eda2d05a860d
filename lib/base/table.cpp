// SPDX-License-Identifier: Apache-2.0
#include "base/table.hpp"

#include "base/text.hpp"

#include <cassert>
#include <cmath>

namespace rillstrand {

std::size_t Column::size() const {
    switch (kind) {
    case ColumnKind::real:
    case ColumnKind::time:
        return real.size();
    case ColumnKind::integer:
    case ColumnKind::boolean:
        return integer.size();
    case ColumnKind::text:
    case ColumnKind::date:
        return text.size();
    }
    return 0;
}

Table::Table(std::string name, std::string title)
    : m_name{std::move(name)}, m_title{std::move(title)} {}

void Table::add(Column column) {
    assert(m_columns.empty() || column.size() == rows());
    m_columns.push_back(std::move(column));
}

void Table::add_real(std::string name, std::string title, std::string unit,
                     std::vector<double> values, int decimals) {
    add({std::move(name),
         std::move(title),
         std::move(unit),
         ColumnKind::real,
         decimals,
         std::move(values),
         {},
         {}});
}

void Table::add_integer(std::string name, std::string title, std::vector<std::int64_t> values) {
    add({std::move(name),
         std::move(title),
         {},
         ColumnKind::integer,
         -1,
         {},
         std::move(values),
         {}});
}

void Table::add_boolean(std::string name, std::string title, const std::vector<bool>& values) {
    add({std::move(name),
         std::move(title),
         {},
         ColumnKind::boolean,
         -1,
         {},
         {values.begin(), values.end()},
         {}});
}

void Table::add_text(std::string name, std::string title, std::vector<std::string> values) {
    add({std::move(name), std::move(title), {}, ColumnKind::text, -1, {}, {}, std::move(values)});
}

void Table::add_time(std::string name, std::string title, std::vector<double> values) {
    add({std::move(name), std::move(title), {}, ColumnKind::time, -1, std::move(values), {}, {}});
}

void Table::add_date(std::string name, std::string title, std::vector<std::string> values) {
    add({std::move(name), std::move(title), {}, ColumnKind::date, -1, {}, {}, std::move(values)});
}

const Column* Table::find(const std::string& name) const {
    for (const auto& column : m_columns)
        if (column.name == name)
            return &column;
    return nullptr;
}

std::string cell_text(const Column& column, std::size_t row) {
    switch (column.kind) {
    case ColumnKind::real:
        if (!std::isfinite(column.real[row]))
            return {};
        return column.decimals < 0 ? text::number(column.real[row])
                                   : text::fixed(column.real[row], column.decimals);
    case ColumnKind::time:
        return text::iso_time(column.real[row]);
    case ColumnKind::integer:
        return std::to_string(column.integer[row]);
    case ColumnKind::boolean:
        return column.integer[row] != 0 ? "true" : "false";
    case ColumnKind::text:
    case ColumnKind::date:
        return column.text[row];
    }
    return {};
}

namespace {
std::string csv_cell(const Column& column, std::size_t row) {
    std::string cell = cell_text(column, row);
    if (column.kind != ColumnKind::text)
        return cell;
    if (!cell.empty() && std::string{"=+-@"}.find(cell.front()) != std::string::npos)
        cell.insert(0, 1, '\'');
    if (cell.find_first_of(",\"\r\n") == std::string::npos)
        return cell;
    std::string quoted = "\"";
    for (const char c : cell) {
        if (c == '"')
            quoted += '"';
        quoted += c;
    }
    return quoted + '"';
}
} // namespace

std::string to_csv(const Table& table) {
    std::string csv;
    const auto& columns = table.columns();
    for (std::size_t j = 0; j < columns.size(); ++j)
        csv += (j > 0 ? "," : "") + columns[j].name;
    csv += '\n';
    for (std::size_t i = 0; i < table.rows(); ++i) {
        for (std::size_t j = 0; j < columns.size(); ++j) {
            if (j > 0)
                csv += ',';
            csv += csv_cell(columns[j], i);
        }
        csv += '\n';
    }
    return csv;
}

} // namespace rillstrand

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <string>
#include <variant>
#include <vector>

namespace rillstrand {

/// What one column of a table holds. Missing is NaN in `real` and `time`, the empty string in
/// `text` and `date`; `integer` and `boolean` have no missing value.
enum class ColumnKind { real, integer, boolean, text, time, date };

/// One named column. Times are UTC seconds since 1970-01-01 (written as ISO 8601 with Z), dates
/// are texts `YYYY-MM-DD`.
struct Column {
    std::string name;  ///< attribute name of formats.md
    std::string title; ///< what it is, for people: layer and field descriptions
    std::string unit;  ///< UDUNITS text, empty where there is none
    ColumnKind kind = ColumnKind::real;
    int decimals = -1;        ///< digits after the point in text output; -1: shortest exact form
    std::vector<double> real; ///< kinds real and time
    std::vector<std::int64_t> integer; ///< kinds integer and boolean (0 or 1)
    std::vector<std::string> text;     ///< kinds text and date

    std::size_t size() const;
};

/// Rows of findings with named columns: the one form that tables, layers and the page are made of.
class Table {
public:
    explicit Table(std::string name, std::string title = {});
    const std::string& name() const { return m_name; }
    const std::string& title() const { return m_title; }

    /// Appends a column; every column of a table has the same number of rows.
    void add_real(std::string name, std::string title, std::string unit, std::vector<double> values,
                  int decimals = -1);
    void add_integer(std::string name, std::string title, std::vector<std::int64_t> values);
    void add_boolean(std::string name, std::string title, const std::vector<bool>& values);
    void add_text(std::string name, std::string title, std::vector<std::string> values);
    /// @param values  UTC seconds since 1970-01-01
    void add_time(std::string name, std::string title, std::vector<double> values);
    /// @param values  texts `YYYY-MM-DD`, empty where missing
    void add_date(std::string name, std::string title, std::vector<std::string> values);

    std::size_t rows() const { return m_columns.empty() ? 0 : m_columns.front().size(); }
    const std::vector<Column>& columns() const { return m_columns; }
    /// @return the column of that name, or nullptr
    const Column* find(const std::string& name) const;

private:
    void add(Column column);
    std::string m_name;
    std::string m_title;
    std::vector<Column> m_columns;
};

/// One cell as text: empty where missing, ISO 8601 with Z for times, `true`/`false` for booleans.
std::string cell_text(const Column& column, std::size_t row);

/// The table as CSV (RFC 4180, LF, header row of names). A text that begins with `=`, `+`, `-` or
/// `@` gets an apostrophe before it, so that no spreadsheet takes it for a formula.
std::string to_csv(const Table& table);

} // namespace rillstrand

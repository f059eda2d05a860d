// SPDX-License-Identifier: Apache-2.0
#include "record/text_head.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "record/cells.hpp"
#include "record/columns.hpp"
#include "record/text_input.hpp"

#include <algorithm>
#include <array>
#include <optional>

namespace rillstrand::record {

namespace {

using campaign::Layout;

/// A number with or without a unit of length behind it: `12.5`, `12.5 m`.
struct Distance {
    double value = 0.0;
    std::string unit;
};

std::optional<Distance> header_distance(std::string_view cell, char decimal) {
    Distance result;
    cell = trim(cell);
    for (const std::string_view unit : {"km", "ft", "m"})
        if (cell.size() > unit.size() && cell.ends_with(unit)) {
            result.unit = unit;
            cell = trim(cell.substr(0, cell.size() - unit.size()));
            break;
        }
    std::string number{cell};
    if (decimal == ',')
        std::replace(number.begin(), number.end(), ',', '.');
    const auto value = text::parse_number(number);
    if (!value)
        return std::nullopt;
    result.value = *value;
    return result;
}

class HeadReader {
public:
    HeadReader(const std::filesystem::path& file, const campaign::Record& record,
               const StampReader& stamps)
        : m_record{record}, m_stamps{stamps}, m_lines{read_head_lines(file, record.text)} {
        m_head.file = file;
        m_head.delimiter =
            record.text.delimiter.value_or(record::tell_delimiter(m_lines, record.text));
        m_head.temperature_unit = record.temperature_unit;
        m_head.distance_unit = record.distance_unit;
        tell_decimal();
    }

    TextHead read() {
        pass_over_preamble();
        split(0, m_header);
        const bool has_header = !is_data(m_header);
        const std::size_t data = has_header ? 1 : 0;
        if (m_lines.lines.size() <= data)
            throw DataError{at(0) + "holds a header and no row of numbers; give a file with data"};
        m_head.first_data_line = m_lines.lines[data].number;
        split(data, m_first);
        m_head.cells = m_header.size();
        if (has_header)
            read_header();
        else
            read_without_header();
        if (m_head.layout == Layout::single)
            find_stamp();
        else
            join_stamp();
        refuse_two_commas();
        return std::move(m_head);
    }

private:
    std::string at(std::size_t which) const {
        return m_head.file.string() + ":" + std::to_string(m_lines.lines[which].number) + ": ";
    }

    std::vector<std::string> cells_of(std::size_t which) const {
        std::vector<std::string_view> cells;
        split_cells(m_lines.lines[which].text, m_head.delimiter, cells, most_distances);
        if (cells.size() > most_distances)
            throw DataError{at(which) + "has over 1000000 columns; this is no trace table"};
        return {cells.begin(), cells.end()};
    }

    void split(std::size_t which, std::vector<std::string>& to) const { to = cells_of(which); }

    /// A comma or a point in the last number that has one: rows come last, words first.
    void tell_decimal() {
        m_head.decimal = m_record.text.decimal.value_or('.');
        if (m_record.text.decimal)
            return;
        const CellReader reader{m_record, m_record.temperature_unit, '.'};
        double value = 0.0;
        for (std::size_t i = m_lines.lines.size(); i-- > 0;)
            for (const auto& cell : cells_of(i)) {
                if (looks_decimal_comma(cell)) {
                    m_head.decimal = ',';
                    return;
                }
                if (cell.find('.') != std::string::npos && reader.number(cell, value))
                    return;
            }
    }

    bool is_data(const std::vector<std::string>& cells) const {
        const CellReader reader{m_record, m_record.temperature_unit, m_head.decimal};
        return std::all_of(cells.begin(), cells.end(), [&](const std::string& cell) {
            double value = 0.0;
            return reader.number(cell, value) || m_stamps.fits(cell) || parse_iso(cell);
        });
    }

    struct Found {
        std::optional<std::size_t> time, distance, temperature;
        std::string time_unit, distance_unit, temperature_unit;
        Layout layout = Layout::told_from_file;
    };

    /// The columns that a header line names, and the layout that they make.
    Found find_columns(const std::vector<std::string>& header, std::size_t next) const {
        const auto& text = m_record.text;
        Found found;
        found.time = find_column(header, text.time_column, found.time_unit);
        found.distance = find_column(header, text.distance_column, found.distance_unit);
        found.temperature = find_column(header, text.temperature_column, found.temperature_unit);
        if (found.distance && found.temperature)
            found.layout =
                found.time && m_record.layout != Layout::single ? Layout::tall : Layout::single;
        else if (header.size() > 1 && found.time && numbers_besides(header, *found.time))
            found.layout = Layout::wide;
        else if (header.size() > 1 && !found.time && numbers_besides(header, 0) &&
                 is_unnamed_time(header, next)) {
            found.time = 0;
            found.layout = Layout::wide;
        }
        return found;
    }

    /// A wide table whose time column has another name than the default, or none: told by the
    /// stamp under it.
    bool is_unnamed_time(const std::vector<std::string>& header, std::size_t next) const {
        if (m_record.text.time_column != campaign::RecordText{}.time_column ||
            header_distance(header[0], m_head.decimal) || next >= m_lines.lines.size())
            return false;
        const auto row = cells_of(next);
        return row.size() == header.size() && m_stamps.fits(row[0]);
    }

    bool numbers_besides(const std::vector<std::string>& header, std::size_t time) const {
        for (std::size_t i = 0; i < header.size(); ++i)
            if (i != time && !header_distance(header[i], m_head.decimal))
                return false;
        return true;
    }

    /// Lines of words above the header need not be counted in skip_lines: the header is the first
    /// line that names the columns.
    void pass_over_preamble() {
        for (std::size_t i = 0; i < m_lines.lines.size(); ++i) {
            const auto cells = cells_of(i);
            if (i == 0 && is_data(cells))
                return;
            const Layout layout = find_columns(cells, i + 1).layout;
            if (layout == Layout::told_from_file ||
                (m_record.layout != Layout::told_from_file && layout != m_record.layout))
                continue;
            for (std::size_t k = 0; k < i; ++k)
                m_lines.preamble.push_back(m_lines.lines[k].text);
            m_lines.lines.erase(m_lines.lines.begin(),
                                m_lines.lines.begin() + static_cast<std::ptrdiff_t>(i));
            return;
        }
    }

    void read_header() {
        const Found found = find_columns(m_header, 1);
        m_head.layout = m_record.layout;
        if (m_head.layout == Layout::told_from_file)
            m_head.layout = found.layout;
        if (m_head.layout == Layout::told_from_file) {
            refuse_two_commas();
            throw DataError{at(0) + "the layout cannot be told from the columns " +
                            listed(m_header) +
                            "; say record.layout and the columns' names in [record.text]"};
        }
        check_time_unit(found);
        if (m_head.layout == Layout::wide) {
            read_wide(found.time);
            return;
        }
        require(m_head.layout == Layout::tall, found.time, "time", m_record.text.time_column);
        require(true, found.distance, "distance", m_record.text.distance_column);
        require(true, found.temperature, "temperature", m_record.text.temperature_column);
        take_units(found.temperature_unit, found.distance_unit);
        m_head.time_cell = found.time.value_or(m_header.size());
        m_head.distance_cell = *found.distance;
        m_head.temperature_cell = *found.temperature;
        take_powers();
    }

    void check_time_unit(const Found& found) const {
        if (found.time_unit == "utc" && m_stamps.zone() != nullptr)
            throw DataError{at(0) + "the header says the times are in UTC, record.time_zone says " +
                            m_stamps.zone_name() + "; correct one of the two"};
    }

    void take_units(const std::string& temperature, const std::string& distance) {
        if (const auto unit = temperature_unit_of(temperature)) {
            if (m_record.temperature_unit_said && *unit != m_record.temperature_unit)
                throw DataError{
                    at(0) + "the header says the temperatures are in '" + temperature +
                    "', record.temperature_unit says otherwise; correct one of the two"};
            m_head.temperature_unit = *unit;
        }
        if (const auto unit = distance_unit_of(distance)) {
            if (m_record.distance_unit_said && *unit != m_record.distance_unit)
                throw DataError{at(0) + "the header says the distances are in '" + distance +
                                "', record.distance_unit says otherwise; correct one of the two"};
            m_head.distance_unit = *unit;
        }
    }

    void require(bool wanted, const std::optional<std::size_t>& found, const std::string& what,
                 const std::string& name) const {
        if (wanted && !found)
            throw DataError{at(0) + "there is no " + what + " column '" + name +
                            "'; the columns are " + listed(m_header) + ", say record.text." + what +
                            "_column"};
    }

    void take_powers() {
        const auto& text = m_record.text;
        const std::array<std::pair<Quantity, std::optional<std::string>>, 4> powers{
            {{Quantity::stokes, text.stokes_column},
             {Quantity::antistokes, text.antistokes_column},
             {Quantity::reverse_stokes, text.reverse_stokes_column},
             {Quantity::reverse_antistokes, text.reverse_antistokes_column}}};
        std::string unit;
        for (const auto& [quantity, name] : powers) {
            if (!name)
                continue;
            const auto found = find_column(m_header, *name, unit);
            if (!found)
                throw DataError{at(0) + "there is no column '" + *name + "'; the columns are " +
                                listed(m_header) + ", correct its name in [record.text]"};
            m_head.power_cells.emplace_back(quantity, *found);
        }
    }

    void read_wide(const std::optional<std::size_t>& time) {
        if (!time)
            throw DataError{at(0) + "there is no time column '" + m_record.text.time_column +
                            "'; the columns are " + listed(m_header) +
                            ", say record.text.time_column"};
        m_head.time_cell = *time;
        std::vector<double> values;
        std::optional<std::string> unit;
        for (std::size_t i = 0; i < m_header.size(); ++i) {
            if (i == *time)
                continue;
            const auto distance = header_distance(m_header[i], m_head.decimal);
            if (!distance)
                throw DataError{at(0) + "column " + std::to_string(i + 1) + ", '" +
                                m_header[i].substr(0, 60) +
                                "', is no distance; the header of a wide table is the time column "
                                "and then distances"};
            if (unit && *unit != distance->unit)
                throw DataError{at(0) + "column " + std::to_string(i + 1) + ", '" + m_header[i] +
                                "', has another unit than the distances before it; write all in "
                                "one unit"};
            unit = distance->unit;
            values.push_back(distance->value);
        }
        if (values.empty())
            throw DataError{at(0) +
                            "the header holds no distance; give 'time' and then the distances"};
        take_units({}, *unit);
        for (const double value : values)
            m_head.distance_m.push_back(to_metres(value, m_head.distance_unit));
        check_distances();
    }

    void check_distances() {
        auto& d = m_head.distance_m;
        m_head.reversed = d.size() > 1 && d.back() < d.front();
        if (m_head.reversed)
            std::reverse(d.begin(), d.end());
        for (std::size_t i = 1; i < d.size(); ++i)
            if (!(d[i] > d[i - 1])) {
                const std::size_t after = m_head.reversed ? i - 1 : i;
                const std::size_t before = m_head.reversed ? i : i - 1;
                throw DataError{
                    at(0) + "distance " + text::number(d[after]) + " m comes after " +
                    text::number(d[before]) + " m; the distances of a header must " +
                    (m_head.reversed ? "all decrease as the first and last do" : "increase") +
                    ", each once"};
            }
    }

    void read_without_header() {
        if (m_record.layout == Layout::wide || m_record.layout == Layout::tall)
            throw DataError{at(0) +
                            "there is no header, only numbers; put a line with the columns' "
                            "names (for a wide table the distances) on top"};
        if (m_header.size() != 2)
            throw DataError{at(0) + "there is no header and not two columns but " +
                            std::to_string(m_header.size()) +
                            "; put a line with the columns' names on top"};
        m_head.layout = Layout::single;
        m_head.time_cell = 2;
        m_head.distance_cell = 0;
        m_head.temperature_cell = 1;
    }

    /// `0,5,10,25` under two names: the comma parts cells and decimals alike.
    void refuse_two_commas() const {
        if (m_head.delimiter != ',' || m_record.text.delimiter || m_header.size() < 2 ||
            m_first.size() != 2 * m_header.size() || !is_data(m_first))
            return;
        throw DataError{at(1) + "has twice as many cells as the header names columns: the comma "
                                "seems to be decimal mark and delimiter at once; write another "
                                "delimiter, such as ;"};
    }

    /// With blanks as delimiter a stamp such as `2031-04-05 06:07:08` makes several cells.
    void join_stamp() {
        if (m_first.size() > m_header.size() && m_head.delimiter == ' ' &&
            m_first.size() - m_header.size() <= 4) {
            const std::size_t more = m_first.size() - m_header.size();
            std::string joined = m_first[m_head.time_cell];
            for (std::size_t i = 1; i <= more; ++i)
                joined += " " + m_first[m_head.time_cell + i];
            if (m_stamps.fits(joined)) {
                m_head.time_cells += more;
                m_head.cells += more;
                for (std::size_t* cell : {&m_head.distance_cell, &m_head.temperature_cell})
                    *cell += *cell > m_head.time_cell ? more : 0;
                for (auto& [quantity, cell] : m_head.power_cells)
                    cell += cell > m_head.time_cell ? more : 0;
                m_head.stamp = joined;
                return;
            }
        }
        if (m_head.time_cell < m_first.size())
            m_head.stamp = m_first[m_head.time_cell];
    }

    void find_stamp() {
        const std::string file = m_head.file.string() + ": ";
        try {
            if (m_record.text.time_from_name) {
                std::string name = m_head.file.filename().string();
                if (name.size() > 3 && name.ends_with(".gz"))
                    name.resize(name.size() - 3);
                m_head.stamp = name;
                m_head.clock = m_stamps.read_name(name);
                return;
            }
            m_head.stamp = header_stamp();
            const auto iso = parse_iso(m_head.stamp);
            m_head.clock =
                iso && !m_record.text.time_from_header ? *iso : m_stamps.read(m_head.stamp);
        } catch (const DataError& error) {
            throw DataError{file + error.what()};
        }
    }

    std::string header_stamp() const {
        const auto& before = m_record.text.time_from_header;
        if (before) {
            for (const auto& line : m_lines.preamble) {
                const std::size_t found = line.find(*before);
                if (found != std::string::npos)
                    return std::string{trim(line.substr(found + before->size()))};
            }
            throw DataError{"no header line holds '" + *before +
                            "'; correct record.text.time_from_header, or say how many lines are "
                            "header in record.text.skip_lines"};
        }
        std::vector<std::string> found;
        for (const auto& line : m_lines.preamble)
            if (auto iso = find_iso(line))
                found.push_back(*iso);
        if (found.size() != 1)
            throw DataError{std::string{found.empty() ? "the time of the trace is not told"
                                                      : "several header lines hold a time"} +
                            "; say record.text.time_from_name or record.text.time_from_header"};
        return found.front();
    }

    const campaign::Record& m_record;
    const StampReader& m_stamps;
    HeadLines m_lines;
    TextHead m_head;
    std::vector<std::string> m_header;
    std::vector<std::string> m_first;
};

} // namespace

TextHead read_head(const std::filesystem::path& file, const campaign::Record& record,
                   const StampReader& stamps) {
    return HeadReader{file, record, stamps}.read();
}

std::string_view stamp_of(const TextHead& head, const std::vector<std::string_view>& cells) {
    const std::string_view first = cells[head.time_cell];
    if (head.time_cells == 1)
        return first;
    const std::string_view last = cells[head.time_cell + head.time_cells - 1];
    return {first.data(), static_cast<std::size_t>(last.data() + last.size() - first.data())};
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/text_head.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "record/cells.hpp"
#include "record/stamps.hpp"
#include "record/text_input.hpp"

#include <algorithm>
#include <cctype>
#include <optional>

namespace rillstrand::record {

namespace {

using campaign::Layout;

constexpr std::size_t most_columns = 1000000;

struct HeadLines {
    std::vector<std::string> preamble; ///< comments and skipped lines, where a stamp may stand
    std::vector<std::pair<std::size_t, std::string>> lines; ///< the first two others
};

HeadLines head_lines(const std::filesystem::path& file, const campaign::RecordText& options) {
    HeadLines head;
    LineSource source{file};
    std::string_view line;
    int skip = options.skip_lines;
    while (head.lines.size() < 3 && source.next(line)) {
        const bool stamp_line = options.time_from_header && head.lines.empty() &&
                                line.find(*options.time_from_header) != std::string_view::npos;
        if (skip > 0 || stamp_line || is_comment(line, options)) {
            if (skip > 0)
                --skip;
            if (head.preamble.size() < 1000)
                head.preamble.emplace_back(line);
        } else {
            head.lines.emplace_back(source.number(), line);
        }
    }
    if (head.lines.empty())
        throw DataError{file.string() + ": is empty; it holds no row of numbers"};
    return head;
}

bool looks_decimal_comma(std::string_view cell) {
    const std::size_t comma = cell.find(',');
    if (comma == std::string_view::npos || comma == 0 || comma + 1 == cell.size())
        return false;
    return std::all_of(cell.begin(), cell.end(), [](char c) {
        return (c >= '0' && c <= '9') || c == ',' || c == '-' || c == '+' || c == 'e' || c == 'E';
    });
}

char tell_delimiter(const HeadLines& head) {
    const std::string& line = head.lines.back().second;
    if (line.find('\t') != std::string::npos)
        return '\t';
    if (line.find(';') != std::string::npos)
        return ';';
    if (line.find(',') == std::string::npos)
        return ' ';
    std::vector<std::string_view> cells;
    split_cells(line, ' ', cells);
    const bool blanks =
        cells.size() > 1 && looks_decimal_comma(cells.back()) &&
        std::count(line.begin(), line.end(), ',') < static_cast<std::ptrdiff_t>(cells.size()) + 1 &&
        head.lines.front().second.find(',') == std::string::npos;
    return blanks ? ' ' : ',';
}

std::string lower(std::string_view text) {
    std::string result{text};
    std::transform(result.begin(), result.end(), result.begin(),
                   [](unsigned char c) { return static_cast<char>(std::tolower(c)); });
    return result;
}

/// A column's name without its unit, and the unit: `Temperature [K]`, `distance_km`.
struct ColumnName {
    std::string name;
    std::string unit;
};

ColumnName column_name(std::string_view header) {
    ColumnName result{lower(trim(header)), {}};
    const std::size_t open = result.name.find_first_of("[(");
    if (open != std::string::npos && open > 0) {
        const std::size_t close = result.name.find_first_of("])", open);
        if (close != std::string::npos) {
            result.unit = std::string{trim(result.name.substr(open + 1, close - open - 1))};
            result.name = std::string{trim(result.name.substr(0, open))};
        }
    }
    return result;
}

/// Position of a column by its name: as it stands, without regard to capitals and unit, or with
/// the unit as its ending.
std::optional<std::size_t> find_column(const std::vector<std::string>& header,
                                       const std::string& name, std::string& unit) {
    for (std::size_t i = 0; i < header.size(); ++i)
        if (header[i] == name)
            return i;
    const std::string wanted = lower(name);
    for (std::size_t i = 0; i < header.size(); ++i) {
        const ColumnName given = column_name(header[i]);
        if (given.name == wanted) {
            unit = given.unit;
            return i;
        }
    }
    for (std::size_t i = 0; i < header.size(); ++i) {
        const std::string given = lower(header[i]);
        if (given.rfind(wanted + "_", 0) != 0)
            continue;
        const std::string ending = given.substr(wanted.size() + 1);
        for (const char* known : {"m", "km", "ft", "c", "degc", "k", "degf", "f", "utc"})
            if (ending == known) {
                unit = ending;
                return i;
            }
    }
    return std::nullopt;
}

std::optional<campaign::TemperatureUnit> temperature_unit_of(const std::string& unit) {
    if (unit == "c" || unit == "degc" || unit == "°c" || unit == "deg c")
        return campaign::TemperatureUnit::degC;
    if (unit == "k" || unit == "kelvin")
        return campaign::TemperatureUnit::kelvin;
    if (unit == "f" || unit == "degf" || unit == "°f")
        return campaign::TemperatureUnit::degF;
    return std::nullopt;
}

std::optional<campaign::DistanceUnit> distance_unit_of(const std::string& unit) {
    if (unit == "m")
        return campaign::DistanceUnit::metre;
    if (unit == "km")
        return campaign::DistanceUnit::kilometre;
    if (unit == "ft")
        return campaign::DistanceUnit::foot;
    return std::nullopt;
}

std::string listed(const std::vector<std::string>& header) {
    std::string list;
    for (std::size_t i = 0; i < header.size() && i < 12; ++i)
        list += (i > 0 ? ", '" : "'") + header[i] + "'";
    return header.size() > 12 ? list + ", …" : list;
}

class HeadReader {
public:
    HeadReader(const std::filesystem::path& file, const campaign::Record& record)
        : m_record{record}, m_lines{head_lines(file, record.text)} {
        m_head.file = file;
        m_head.delimiter = record.text.delimiter.value_or(tell_delimiter(m_lines));
        m_head.temperature_unit = record.temperature_unit;
        m_head.distance_unit = record.distance_unit;
    }

    TextHead read() {
        split(0, m_header);
        const bool has_header = !first_line_is_data();
        m_head.cells = m_header.size();
        const std::size_t data = has_header ? 1 : 0;
        if (m_lines.lines.size() <= data)
            throw DataError{at(0) + "holds a header and no row of numbers; give a file with data"};
        m_head.first_data_line = m_lines.lines[data].first;
        split(data, m_first);
        tell_decimal();
        if (has_header)
            read_header();
        else
            read_without_header();
        if (m_head.layout == Layout::single)
            find_stamp();
        else if (m_head.time_cell < m_first.size())
            m_head.first_stamp = m_first[m_head.time_cell];
        return m_head;
    }

private:
    std::string at(std::size_t which) const {
        return m_head.file.string() + ":" + std::to_string(m_lines.lines[which].first) + ": ";
    }

    void split(std::size_t which, std::vector<std::string>& to) const {
        std::vector<std::string_view> cells;
        split_cells(m_lines.lines[which].second, m_head.delimiter, cells);
        if (cells.size() > most_columns)
            throw DataError{at(which) + "has over 1000000 columns; this is no trace table"};
        to.assign(cells.begin(), cells.end());
    }

    bool first_line_is_data() const {
        const CellReader reader{m_record, m_record.temperature_unit, ','};
        return std::all_of(m_header.begin(), m_header.end(), [&reader](const std::string& cell) {
            double value = 0.0;
            return reader.number(cell, value) || parse_iso(cell);
        });
    }

    void tell_decimal() {
        const bool comma = std::any_of(m_first.begin(), m_first.end(), [](const std::string& cell) {
            return looks_decimal_comma(cell);
        });
        m_head.decimal =
            m_record.text.decimal.value_or(m_head.delimiter != ',' && comma ? ',' : '.');
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

    void read_header() {
        std::string time_unit, distance_unit, temperature_unit;
        const auto& text = m_record.text;
        const auto time = find_column(m_header, text.time_column, time_unit);
        const auto distance = find_column(m_header, text.distance_column, distance_unit);
        const auto temperature = find_column(m_header, text.temperature_column, temperature_unit);
        m_head.layout = m_record.layout;
        if (m_head.layout == Layout::told_from_file) {
            if (time && distance && temperature)
                m_head.layout = Layout::tall;
            else if (distance && temperature)
                m_head.layout = Layout::single;
            else if (time && numbers_besides(*time))
                m_head.layout = Layout::wide;
            else
                throw DataError{at(0) + "the layout cannot be told from the columns " +
                                listed(m_header) +
                                "; say record.layout and the columns' names in [record.text]"};
        }
        if (m_head.layout == Layout::wide) {
            read_wide(time);
            return;
        }
        take_units(temperature_unit, distance_unit);
        require(m_head.layout == Layout::tall, time, "time", text.time_column);
        require(true, distance, "distance", text.distance_column);
        require(true, temperature, "temperature", text.temperature_column);
        m_head.time_cell = time.value_or(m_header.size());
        m_head.distance_cell = *distance;
        m_head.temperature_cell = *temperature;
        take_powers();
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

    static std::optional<double> header_distance(std::string_view cell, char decimal) {
        cell = trim(cell);
        if (cell.size() > 1 && cell.back() == 'm')
            cell = trim(cell.substr(0, cell.size() - 1));
        std::string number{cell};
        if (decimal == ',')
            std::replace(number.begin(), number.end(), ',', '.');
        return text::parse_number(number);
    }

    bool numbers_besides(std::size_t time) const {
        for (std::size_t i = 0; i < m_header.size(); ++i)
            if (i != time && !header_distance(m_header[i], m_head.decimal))
                return false;
        return m_header.size() > 1;
    }

    void read_wide(const std::optional<std::size_t>& time) {
        if (!time)
            throw DataError{at(0) + "there is no time column '" + m_record.text.time_column +
                            "'; the columns are " + listed(m_header) +
                            ", say record.text.time_column"};
        m_head.time_cell = *time;
        for (std::size_t i = 0; i < m_header.size(); ++i) {
            if (i == *time)
                continue;
            const auto value = header_distance(m_header[i], m_head.decimal);
            if (!value)
                throw DataError{at(0) + "column " + std::to_string(i + 1) + ", '" + m_header[i] +
                                "', is no distance; the header of a wide table is the time column "
                                "and then distances"};
            m_head.distance_m.push_back(to_metres(*value, m_head.distance_unit));
        }
        if (m_head.distance_m.empty())
            throw DataError{at(0) +
                            "the header holds no distance; give 'time' and then the distances"};
        check_distances();
    }

    void check_distances() {
        auto& d = m_head.distance_m;
        m_head.reversed = d.size() > 1 && d.back() < d.front();
        if (m_head.reversed)
            std::reverse(d.begin(), d.end());
        for (std::size_t i = 1; i < d.size(); ++i)
            if (!(d[i] > d[i - 1]))
                throw DataError{at(0) + "distance " + text::number(d[i]) + " m comes after " +
                                text::number(d[i - 1]) +
                                " m; the distances of a header must increase, each once"};
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

    void find_stamp() {
        const auto& options = m_record.text;
        if (options.time_from_name) {
            m_head.stamp = m_head.file.filename().string();
            if (m_head.stamp.size() > 3 && m_head.stamp.ends_with(".gz"))
                m_head.stamp.resize(m_head.stamp.size() - 3);
            m_head.stamp_format = *options.time_from_name;
            const std::string stem = std::filesystem::path{m_head.stamp}.stem().string();
            const std::string extension = std::filesystem::path{m_head.stamp}.extension().string();
            if (!m_head.stamp_format.ends_with(extension) || extension.empty())
                m_head.stamp = stem;
            return;
        }
        if (options.time_from_header) {
            for (const auto& line : m_lines.preamble) {
                const std::size_t found = line.find(*options.time_from_header);
                if (found == std::string::npos)
                    continue;
                m_head.stamp =
                    std::string{trim(line.substr(found + options.time_from_header->size()))};
                return;
            }
            throw DataError{m_head.file.string() + ": no header line holds '" +
                            *options.time_from_header +
                            "'; correct record.text.time_from_header, or say how many lines are "
                            "header in record.text.skip_lines"};
        }
        std::vector<std::string> found;
        for (const auto& line : m_lines.preamble)
            if (auto iso = find_iso(line))
                found.push_back(*iso);
        if (found.size() != 1)
            throw DataError{m_head.file.string() +
                            (found.empty() ? ": the time of the trace is not told"
                                           : ": several header lines hold a time") +
                            "; say record.text.time_from_name or record.text.time_from_header"};
        m_head.stamp = found.front();
    }

    const campaign::Record& m_record;
    HeadLines m_lines;
    TextHead m_head;
    std::vector<std::string> m_header;
    std::vector<std::string> m_first;
};

} // namespace

bool is_comment(std::string_view line, const campaign::RecordText& options) {
    const std::string_view text = trim(line);
    return text.empty() || (!options.comment.empty() && text.rfind(options.comment, 0) == 0);
}

TextHead read_head(const std::filesystem::path& file, const campaign::Record& record) {
    return HeadReader{file, record}.read();
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/side_series.hpp"

#include "base/text.hpp"
#include "record/cells.hpp"
#include "record/columns.hpp"
#include "record/delimited.hpp"
#include "record/gather_parts.hpp"
#include "record/stamps.hpp"
#include "record/text_input.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <optional>
#include <utility>

namespace rillstrand::record {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

double at_instant(const SideValues& series, double time_s, double largest_gap_s) {
    const double* begin = series.time_s.data();
    const double* end = begin + series.time_s.size();
    const auto k = std::lower_bound(begin, end, time_s) - begin;
    if (k < series.time_s.size() && series.time_s(k) == time_s)
        return series.value(k);
    if (k == 0 || k == series.time_s.size())
        return nan;
    const double span_s = series.time_s(k) - series.time_s(k - 1);
    if (span_s > largest_gap_s)
        return nan;
    const double w = (time_s - series.time_s(k - 1)) / span_s;
    return (1.0 - w) * series.value(k - 1) + w * series.value(k);
}

} // namespace

namespace {

constexpr std::size_t most_samples = 20000000;
constexpr std::size_t most_columns = 10000;
constexpr std::size_t most_told = 20;

/// Reads the two columns of a series as they stand.
class SeriesReader {
public:
    SeriesReader(const campaign::SideSeries& series, const campaign::Record& record)
        : m_series{series}, m_record{record}, m_stamps{record}, m_sequence{m_stamps} {}

    void read() {
        LineSource source{m_series.file, std::size_t{1} << 18U};
        std::string_view line;
        while (source.next(line) && m_problems.list().size() < most_told) {
            m_line = source.number();
            const std::string_view text = trim(line);
            if (text.empty() || text.front() == '#')
                continue;
            if (m_header.empty())
                take_header(text);
            else
                take_row(line);
        }
        m_problems.throw_if_any();
        if (m_header.empty())
            throw DataError{m_series.file.string() + ": is empty; it needs a header and rows"};
        m_sequence.finish();
        if (values.empty())
            throw DataError{m_series.file.string() + ": column '" + m_series.column +
                            "' holds no number; give the right column"};
    }

    std::vector<double> times_s, values;
    std::vector<std::size_t> lines;
    bool sorted = true;

private:
    void take_header(std::string_view text) {
        m_delimiter = tell_table_delimiter(text);
        split_cells(text, m_delimiter, m_cells, most_columns);
        m_header.assign(m_cells.begin(), m_cells.end());
        std::string unit;
        const auto time = find_column(m_header, "time", unit);
        if (time && unit == "utc" && m_stamps.zone() != nullptr)
            throw DataError{m_series.file.string() + ":" + std::to_string(m_line) +
                            ": the header says the times are in UTC, record.time_zone says " +
                            m_stamps.zone_name() + "; write the stamps with an offset (Z)"};
        const auto value = find_column(m_header, m_series.column, unit);
        for (const auto& [found, name] :
             {std::pair{time, std::string{"time"}}, std::pair{value, m_series.column}})
            if (!found)
                throw DataError{m_series.file.string() + ": there is no column '" + name +
                                "'; the columns are " + listed(m_header)};
        m_time = *time;
        m_value = *value;
    }

    void take_row(std::string_view line) {
        const std::string place = m_series.file.string() + ":" + std::to_string(m_line) + ": ";
        split_cells(line, m_delimiter, m_cells, m_header.size() + 1);
        // With blanks as delimiter a stamp may be two cells: a day and a clock.
        const bool two = m_delimiter == ' ' && m_cells.size() == m_header.size() + 1;
        if (m_cells.size() != m_header.size() && !two)
            throw DataError{place + ragged(m_cells.size(), m_header.size())};
        std::string_view stamp = m_cells[m_time];
        if (two)
            stamp = {stamp.data(),
                     static_cast<std::size_t>(m_cells[m_time + 1].data() +
                                              m_cells[m_time + 1].size() - stamp.data())};
        const std::size_t cell = m_value + (two && m_value > m_time ? 1 : 0);
        try {
            const auto iso = parse_iso(stamp);
            const double time_s =
                iso ? m_sequence.next(*iso, stamp, m_series.file, m_line)
                    : read_stamp(m_stamps, m_sequence, stamp, m_series.file, m_line);
            keep(time_s, m_cells[cell], place);
        } catch (const DataError& error) {
            m_problems.add(error);
        }
    }

    void keep(double time_s, std::string_view cell, const std::string& place) {
        sorted = sorted && (times_s.empty() || time_s >= times_s.back());
        // With another delimiter than a comma, 12,5 is a number with a decimal comma.
        const CellReader& reader = looks_decimal_comma(cell) ? m_comma : m_point;
        double value = 0.0;
        if (!reader.number(cell, value))
            throw DataError{place + m_header[m_value] + " is '" + std::string{cell.substr(0, 60)} +
                            "', which is no number; correct it, or leave it empty where it is "
                            "missing"};
        if (std::isnan(value))
            return;
        if (values.size() >= most_samples)
            throw DataError{place + "the series has over 20000000 samples; thin it out"};
        times_s.push_back(time_s);
        values.push_back(value);
        lines.push_back(m_line);
    }

    const campaign::SideSeries& m_series;
    const campaign::Record& m_record;
    StampReader m_stamps;
    ClockSequence m_sequence;
    CellReader m_point{m_record, campaign::TemperatureUnit::degC, '.'};
    CellReader m_comma{m_record, campaign::TemperatureUnit::degC, ','};
    Problems m_problems;
    std::vector<std::string> m_header;
    std::vector<std::string_view> m_cells;
    char m_delimiter = ',';
    std::size_t m_time = 0, m_value = 0, m_line = 0;
};

} // namespace

SideValues read_side_series(const campaign::SideSeries& series, const campaign::Record& record) {
    SeriesReader read{series, record};
    read.read();
    std::vector<std::size_t> order(read.values.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::stable_sort(order.begin(), order.end(), [&read](std::size_t a, std::size_t b) {
        return read.times_s[a] < read.times_s[b];
    });
    SideValues result;
    if (!read.sorted)
        result.warnings.push_back(
            {"series-time-backwards",
             series.file.string() + ": time runs backwards; the rows were sorted by time"});
    std::vector<double> t, v;
    std::size_t last_line = 0;
    for (const std::size_t i : order) {
        if (!t.empty() && read.times_s[i] == t.back()) {
            if (read.values[i] != v.back())
                throw DataError{series.file.string() + ":" + std::to_string(read.lines[i]) +
                                ": column '" + series.column + "' has two values at " +
                                text::iso_time(read.times_s[i]) + ", the other in line " +
                                std::to_string(last_line) + "; take one out"};
            continue;
        }
        t.push_back(read.times_s[i]);
        v.push_back(read.values[i]);
        last_line = read.lines[i];
    }
    const auto n = static_cast<Eigen::Index>(t.size());
    result.time_s = Eigen::Map<const Eigen::ArrayXd>(t.data(), n);
    result.value = Eigen::Map<const Eigen::ArrayXd>(v.data(), n);
    return result;
}

Eigen::ArrayXd mean_over_intervals(const SideValues& series, const Eigen::ArrayXd& time_s,
                                   double interval_s, double largest_gap_s) {
    Eigen::ArrayXd result(time_s.size());
    const double* begin = series.time_s.data();
    const double* end = begin + series.time_s.size();
    for (Eigen::Index i = 0; i < time_s.size(); ++i) {
        const double from_s = time_s(i) - 0.5 * interval_s;
        const double to_s = time_s(i) + 0.5 * interval_s;
        const double first = at_instant(series, from_s, largest_gap_s);
        const double last = at_instant(series, to_s, largest_gap_s);
        const double middle = at_instant(series, time_s(i), largest_gap_s);
        if (interval_s <= 0.0 || std::isnan(first) || std::isnan(last)) {
            result(i) = middle;
            continue;
        }
        // Area under the line through the samples inside and the two ends.
        double area = 0.0, t = from_s, v = first, pause_s = 0.0;
        for (auto k = std::upper_bound(begin, end, from_s) - begin;
             k < series.time_s.size() && series.time_s(k) < to_s; ++k) {
            pause_s = std::max(pause_s, series.time_s(k) - t);
            area += 0.5 * (v + series.value(k)) * (series.time_s(k) - t);
            t = series.time_s(k);
            v = series.value(k);
        }
        area += 0.5 * (v + last) * (to_s - t);
        pause_s = std::max(pause_s, to_s - t);
        result(i) = pause_s > largest_gap_s ? nan : area / interval_s;
    }
    return result;
}

double usual_gap_s(const SideValues& series) {
    constexpr double hour_s = 3600.0;
    if (series.time_s.size() < 2)
        return hour_s;
    std::vector<double> steps;
    for (Eigen::Index i = 1; i < series.time_s.size(); ++i)
        steps.push_back(series.time_s(i) - series.time_s(i - 1));
    const auto middle = steps.begin() + static_cast<std::ptrdiff_t>(steps.size() / 2);
    std::nth_element(steps.begin(), middle, steps.end());
    return std::max(hour_s, 3.0 * *middle);
}

} // namespace rillstrand::record

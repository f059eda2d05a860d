// SPDX-License-Identifier: Apache-2.0
#include "record/side_series.hpp"

#include "base/text.hpp"
#include "record/delimited.hpp"
#include "record/stamps.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>

namespace rillstrand::record {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

std::string listed(const std::vector<std::string>& header) {
    std::string list;
    for (std::size_t i = 0; i < header.size() && i < 12; ++i)
        list += (i > 0 ? ", '" : "'") + header[i] + "'";
    return list;
}

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

SideValues read_side_series(const campaign::SideSeries& series, const campaign::Record& record) {
    const Delimited table = read_delimited(series.file);
    const auto time = table.column("time");
    const auto value = table.column(series.column);
    if (!time)
        throw DataError{series.file.string() + ": there is no column 'time'; the columns are " +
                        listed(table.header)};
    if (!value)
        throw DataError{series.file.string() + ": there is no column '" + series.column +
                        "'; the columns are " + listed(table.header)};
    campaign::Record iso = record;
    iso.text.time_format.reset();
    const StampReader own{record};
    const StampReader plain{iso};
    std::vector<double> times_s, values;
    std::optional<double> previous_s;
    Problems problems;
    bool sorted = true;
    for (std::size_t i = 0; i < table.rows.size() && problems.list().size() < 20; ++i) {
        try {
            const std::string& stamp = table.rows[i][*time];
            const StampReader& reader = parse_iso(stamp) ? plain : own;
            const double time_s = reader.read(stamp, previous_s);
            if (previous_s && time_s < *previous_s)
                sorted = false;
            previous_s = time_s;
            if (const auto number = table.number(i, *value)) {
                times_s.push_back(time_s);
                values.push_back(*number);
            }
        } catch (const DataError& error) {
            const std::string what = error.what();
            problems.add(what.rfind(table.file.string(), 0) == 0 ? what
                                                                 : table.place(i) + ": " + what);
        }
    }
    problems.throw_if_any();
    if (values.empty())
        throw DataError{series.file.string() + ": column '" + series.column +
                        "' holds no number; give the right column"};
    std::vector<std::size_t> order(values.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::stable_sort(order.begin(), order.end(),
                     [&](std::size_t a, std::size_t b) { return times_s[a] < times_s[b]; });
    SideValues result;
    if (!sorted)
        result.warnings.push_back(
            {"series-time-backwards",
             series.file.string() + ": time runs backwards; the rows were sorted by time"});
    std::vector<double> t, v;
    for (const std::size_t i : order) {
        if (!t.empty() && times_s[i] == t.back()) {
            if (values[i] != v.back())
                throw DataError{series.file.string() + ": column '" + series.column +
                                "' has two values at " + text::iso_time(times_s[i]) +
                                "; take one out"};
            continue;
        }
        t.push_back(times_s[i]);
        v.push_back(values[i]);
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
        double area = 0.0, t = from_s, v = first;
        for (auto k = std::upper_bound(begin, end, from_s) - begin;
             k < series.time_s.size() && series.time_s(k) < to_s; ++k) {
            area += 0.5 * (v + series.value(k)) * (series.time_s(k) - t);
            t = series.time_s(k);
            v = series.value(k);
        }
        area += 0.5 * (v + last) * (to_s - t);
        result(i) = area / interval_s;
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

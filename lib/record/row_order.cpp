// SPDX-License-Identifier: Apache-2.0
#include "record/row_order.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::record {

namespace {

bool same_values(const Trace& a, const Trace& b) {
    for (std::size_t q = 0; q < a.rows.size(); ++q)
        for (Eigen::Index j = 0; j < a.rows[q].size(); ++j) {
            const float x = a.rows[q](j), y = b.rows[q](j);
            if (x != y && !(std::isnan(x) && std::isnan(y)))
                return false;
        }
    return true;
}

std::string counted(std::int64_t count, const std::string& what) {
    return std::to_string(count) + " " + what + (count == 1 ? "" : "s");
}

double shift_to_middle(const campaign::Record& record, double interval_s) {
    switch (record.stamp) {
    case campaign::Stamp::start:
        return 0.5 * interval_s;
    case campaign::Stamp::middle:
        return 0.0;
    case campaign::Stamp::end:
        return -0.5 * interval_s;
    }
    return 0.0;
}

} // namespace

double tell_interval(const campaign::Record& record, std::vector<double> sorted_times_s,
                     GatherReport& report) {
    if (record.interval_s)
        return *record.interval_s;
    std::vector<double> steps;
    for (std::size_t i = 1; i < sorted_times_s.size(); ++i)
        if (sorted_times_s[i] > sorted_times_s[i - 1])
            steps.push_back(sorted_times_s[i] - sorted_times_s[i - 1]);
    report.interval_told = true;
    if (steps.empty()) {
        if (record.stamp != campaign::Stamp::middle)
            throw DataError{
                "record.interval_s: one trace alone does not tell the averaging interval "
                "that record.stamp needs; say record.interval_s"};
        return 0.0;
    }
    const auto middle = steps.begin() + static_cast<std::ptrdiff_t>(steps.size() / 2);
    std::nth_element(steps.begin(), middle, steps.end());
    return *middle;
}

RowOrder::RowOrder(const campaign::Record& record, GatherReport& report, Sink& sink)
    : m_record{record}, m_report{report}, m_sink{sink} {}

void RowOrder::take(Trace trace) {
    if (!m_holding) {
        m_held = std::move(trace);
        m_holding = true;
        return;
    }
    // Stamps nearer than a millisecond are one time: binary fractions of a second differ by less.
    if (trace.time_s - m_held.time_s > 1e-3) {
        hand_on();
        m_held = std::move(trace);
        return;
    }
    ++m_report.duplicates;
    const auto is_copy = [&trace](const Trace& other) { return same_values(other, trace); };
    if (is_copy(m_held) || std::any_of(m_others.begin(), m_others.end(), is_copy))
        return;
    if (m_record.duplicates == campaign::Duplicates::refuse)
        throw DataError{trace.origin + ": a trace of " + text::iso_time(trace.time_s) +
                        " stands here and in " + m_held.origin +
                        " with other values; take one out, or say record.duplicates = \"first\" or "
                        "\"mean\""};
    if (m_record.duplicates == campaign::Duplicates::first)
        return;
    if (m_others.size() >= most_copies)
        throw DataError{trace.origin + ": is the " + std::to_string(most_copies + 2) +
                        ". trace of " + text::iso_time(trace.time_s) +
                        " with other values; see record.text.time_format and the stamps"};
    m_others.push_back(std::move(trace));
}

void RowOrder::take_mean() {
    for (std::size_t q = 0; q < m_held.rows.size(); ++q)
        for (Eigen::Index j = 0; j < m_held.rows[q].size(); ++j) {
            double sum = 0.0;
            int count = 0;
            const auto add = [&](float value) {
                if (std::isnan(value))
                    return;
                sum += static_cast<double>(value);
                ++count;
            };
            add(m_held.rows[q](j));
            for (const auto& other : m_others)
                add(other.rows[q](j));
            if (count > 0)
                m_held.rows[q](j) = static_cast<float>(sum / count);
        }
    m_others.clear();
}

void RowOrder::hand_on() {
    if (!m_others.empty())
        take_mean();
    if (m_report.traces > 0 && m_report.interval_s > 0.0 &&
        m_held.time_s - m_last_s > 1.5 * m_report.interval_s)
        m_report.gaps.push_back({m_last_s, m_held.time_s});
    m_last_s = m_held.time_s;
    m_channels = m_held.rows.front().size();
    m_sink.add_row(m_held.time_s + m_record.clock_offset_s +
                       shift_to_middle(m_record, m_report.interval_s),
                   m_held.rows);
    ++m_report.traces;
}

void RowOrder::finish() {
    if (m_holding)
        hand_on();
    m_holding = false;
    refuse_wrong_unit(m_report.cells, m_record, "record");
    if (m_report.cells.values == 0)
        throw DataError{"record: no trace holds a single temperature; see record.missing, "
                        "record.valid_range_c and the columns' names"};
    auto& warnings = m_report.warnings;
    if (m_report.traces == 1)
        warnings.push_back({"record-one-trace",
                            "the record is one trace; nothing that needs change "
                            "in time can be told from it"});
    if (m_channels == 1)
        warnings.push_back({"record-one-channel",
                            "the record has one channel; nothing that needs its neighbours can be "
                            "told from it"});
    if (m_report.duplicates > 0)
        warnings.push_back(
            {"record-duplicates", counted(m_report.duplicates, "trace") +
                                      (m_report.duplicates == 1 ? " is" : " are") +
                                      " of a time that was there before; each time is kept once"});
    if (m_report.cells.out_of_range > 0)
        warnings.push_back(
            {"record-out-of-range", counted(m_report.cells.out_of_range, "temperature") +
                                        " outside record.valid_range_c " +
                                        (m_report.cells.out_of_range == 1 ? "is" : "are") +
                                        " set missing"});
    if (!m_report.gaps.empty()) {
        const auto longest = std::max_element(
            m_report.gaps.begin(), m_report.gaps.end(),
            [](const Gap& a, const Gap& b) { return a.to_s - a.from_s < b.to_s - b.from_s; });
        warnings.push_back(
            {"record-gap", counted(static_cast<std::int64_t>(m_report.gaps.size()), "gap") +
                               " in time; the longest is " +
                               text::fixed((longest->to_s - longest->from_s) / 3600.0, 2) +
                               " h from " + text::iso_time(longest->from_s)});
    }
}

Eigen::ArrayXf on_axis(const Eigen::ArrayXd& from_m, const Eigen::ArrayXf& row,
                       const Eigen::ArrayXd& to_m, campaign::Align align) {
    Eigen::ArrayXf result =
        Eigen::ArrayXf::Constant(to_m.size(), std::numeric_limits<float>::quiet_NaN());
    const Eigen::Index n = from_m.size();
    Eigen::Index k = 0; // last place of from_m at or before to_m(j)
    for (Eigen::Index j = 0; j < to_m.size(); ++j) {
        while (k + 1 < n && from_m(k + 1) <= to_m(j))
            ++k;
        const Eigen::Index next = std::min(k + 1, n - 1);
        if (align == campaign::Align::nearest) {
            const Eigen::Index at =
                std::abs(from_m(next) - to_m(j)) < std::abs(from_m(k) - to_m(j)) ? next : k;
            const double spacing_m = n < 2        ? 0.0
                                     : at + 1 < n ? from_m(at + 1) - from_m(at)
                                                  : from_m(at) - from_m(at - 1);
            if (std::abs(from_m(at) - to_m(j)) <= 0.5 * spacing_m + 1e-6)
                result(j) = row(at);
        } else if (std::abs(from_m(k) - to_m(j)) < 1e-6) {
            result(j) = row(k);
        } else if (from_m(k) < to_m(j) && next > k) {
            const double w = (to_m(j) - from_m(k)) / (from_m(next) - from_m(k));
            result(j) = static_cast<float>((1.0 - w) * static_cast<double>(row(k)) +
                                           w * static_cast<double>(row(next)));
        }
    }
    return result;
}

void check_axes(const Eigen::ArrayXd& first, const std::string& first_file,
                const Eigen::ArrayXd& other, const std::string& other_file, campaign::Align align) {
    const bool same = first.size() == other.size() &&
                      (first.size() == 0 || (first - other).abs().maxCoeff() < 1e-6);
    if (same || align != campaign::Align::refuse)
        return;
    const auto axis = [](const Eigen::ArrayXd& d) {
        return std::to_string(d.size()) + " distances from " + text::number(d(0)) + " to " +
               text::number(d(d.size() - 1)) + " m";
    };
    std::string where;
    for (Eigen::Index j = 0; j < std::min(first.size(), other.size()); ++j)
        if (std::abs(first(j) - other(j)) >= 1e-6) {
            where = ", first apart at the " + std::to_string(j + 1) + ". (" +
                    text::number(first(j)) + " and " + text::number(other(j)) + " m)";
            break;
        }
    throw DataError{other_file + ": has " + axis(other) + ", but " + first_file + " has " +
                    axis(first) + where +
                    R"(; say record.align = "nearest" or "linear" to bring them to the first)"};
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/gather_parts.hpp"

#include "base/text.hpp"
#include "record/row_order.hpp"
#include "record/text_input.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace rillstrand::record {

namespace {

constexpr std::size_t largest_trace = std::size_t{1} << 30U;

/// One trace file in full.
struct SingleTrace {
    Eigen::ArrayXd distance_m;
    std::vector<Eigen::ArrayXf> rows;
    CellCounts counts;
    std::string wrong;
};

class SingleReader {
public:
    SingleReader(const campaign::Record& record, const TextHead& head)
        : m_options{record.text}, m_head{head}, m_cells{record, head.temperature_unit,
                                                        head.decimal} {}

    SingleTrace read() {
        const std::string text = read_text(m_head.file, largest_trace);
        m_values.resize(1 + m_head.power_cells.size());
        std::size_t at = 0;
        std::size_t number = 0;
        while (at < text.size()) {
            std::size_t end = text.find_first_of("\n\r", at);
            if (end == std::string::npos)
                end = text.size();
            const std::string_view line = std::string_view{text}.substr(at, end - at);
            at = end + 1;
            if (end + 1 < text.size() && text[end] == '\r' && text[end + 1] == '\n')
                ++at;
            if (++number < m_head.first_data_line || is_comment(line, m_options))
                continue;
            take(line, number);
        }
        return close();
    }

private:
    void take(std::string_view line, std::size_t number) {
        split_cells(line, m_head.delimiter, m_row);
        if (m_row.size() != m_head.cells)
            refuse(m_head.file, number,
                   "has " + std::to_string(m_row.size()) + " cells where the rows above have " +
                       std::to_string(m_head.cells) + "; complete or remove the line");
        double distance = 0.0;
        if (!m_cells.number(m_row[m_head.distance_cell], distance) || std::isnan(distance))
            refuse_cell(number, m_head.distance_cell, "distance");
        distance = to_metres(distance, m_head.distance_unit);
        m_distance_m.push_back(distance);
        float value = 0.0F;
        if (!m_cells.temperature(m_row[m_head.temperature_cell], value, m_trace.counts))
            refuse_cell(number, m_head.temperature_cell, "temperature");
        m_values[0].push_back(value);
        for (std::size_t q = 0; q < m_head.power_cells.size(); ++q) {
            double power = 0.0;
            if (!m_cells.number(m_row[m_head.power_cells[q].second], power))
                refuse_cell(number, m_head.power_cells[q].second, "power");
            m_values[q + 1].push_back(static_cast<float>(power));
        }
    }

    [[noreturn]] void refuse_cell(std::size_t number, std::size_t cell, const std::string& what) {
        refuse(m_head.file, number,
               "'" + std::string{m_row[cell]} + "' is no " + what +
                   "; correct it, or add the text to "
                   "record.missing");
    }

    SingleTrace close() {
        const auto n = static_cast<Eigen::Index>(m_distance_m.size());
        if (n == 0)
            throw DataError{m_head.file.string() + ": holds no row of numbers; remove the file or "
                                                   "complete it"};
        if (n > 1 && m_distance_m.back() < m_distance_m.front()) {
            std::reverse(m_distance_m.begin(), m_distance_m.end());
            for (auto& values : m_values)
                std::reverse(values.begin(), values.end());
        }
        for (std::size_t i = 1; i < m_distance_m.size(); ++i)
            if (!(m_distance_m[i] > m_distance_m[i - 1]))
                throw DataError{m_head.file.string() + ": distance " +
                                text::number(m_distance_m[i]) + " m comes after " +
                                text::number(m_distance_m[i - 1]) +
                                " m; distances must increase, each once"};
        m_trace.distance_m = Eigen::Map<const Eigen::ArrayXd>(m_distance_m.data(), n);
        for (const auto& values : m_values)
            m_trace.rows.emplace_back(Eigen::Map<const Eigen::ArrayXf>(values.data(), n));
        return std::move(m_trace);
    }

    const campaign::RecordText& m_options;
    const TextHead& m_head;
    CellReader m_cells;
    SingleTrace m_trace;
    std::vector<std::string_view> m_row;
    std::vector<double> m_distance_m;
    std::vector<std::vector<float>> m_values;
};

SingleTrace read_single(const campaign::Record& record, const TextHead& head) {
    try {
        return SingleReader{record, head}.read();
    } catch (const DataError& error) {
        SingleTrace trace;
        trace.wrong = error.what();
        return trace;
    }
}

/// Stamps of all files; repeated local hours are told by the order of the files' names.
std::vector<double> read_stamps(const TextJob& job) {
    std::vector<double> times_s(job.heads.size());
    Problems problems;
    std::optional<double> previous_s;
    for (std::size_t i = 0; i < job.heads.size(); ++i) {
        const TextHead& head = job.heads[i];
        try {
            times_s[i] = job.stamps.read(head.stamp, previous_s, head.stamp_format);
            previous_s = times_s[i];
        } catch (const DataError& error) {
            if (problems.list().size() < 20)
                problems.add(head.file.string() + ": " + error.what());
        }
    }
    problems.throw_if_any();
    return times_s;
}

} // namespace

void gather_single(const TextJob& job) {
    const std::size_t n = job.heads.size();
    const std::vector<double> times_s = read_stamps(job);
    std::vector<std::size_t> order(n);
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::stable_sort(order.begin(), order.end(),
                     [&](std::size_t a, std::size_t b) { return times_s[a] < times_s[b]; });
    std::vector<double> sorted_s;
    for (const std::size_t i : order)
        sorted_s.push_back(times_s[i]);
    job.report.interval_s = tell_interval(job.record, sorted_s, job.report);

    const SingleTrace first = read_single(job.record, job.heads[order[0]]);
    if (!first.wrong.empty())
        throw DataError{first.wrong};
    RecordHead head{first.distance_m,
                    {Quantity::temperature},
                    static_cast<std::int64_t>(n),
                    job.report.interval_s};
    for (const auto& [quantity, cell] : job.heads[order[0]].power_cells)
        head.quantities.push_back(quantity);
    RowOrder rows{job.record, job.report, job.make_sink(head)};
    const std::string first_file = job.heads[order[0]].file.string();

    constexpr std::size_t batch = 64;
    job.progress.stage("reading traces", static_cast<double>(n), "traces");
    for (std::size_t begin = 0; begin < n; begin += batch) {
        const std::size_t count = std::min(batch, n - begin);
        std::vector<SingleTrace> traces(count);
        tbb::parallel_for(std::size_t{0}, count, [&](std::size_t k) {
            traces[k] = read_single(job.record, job.heads[order[begin + k]]);
        });
        Problems problems;
        for (std::size_t k = 0; k < count; ++k) {
            SingleTrace& trace = traces[k];
            if (!trace.wrong.empty()) {
                problems.add(trace.wrong);
                continue;
            }
            if (!problems.empty())
                continue;
            const std::string name = job.heads[order[begin + k]].file.string();
            check_axes(first.distance_m, first_file, trace.distance_m, name, job.record.align);
            if (trace.distance_m.size() != first.distance_m.size() ||
                (trace.distance_m - first.distance_m).abs().maxCoeff() >= 1e-6)
                for (auto& row : trace.rows)
                    row = on_axis(trace.distance_m, row, first.distance_m, job.record.align);
            job.report.cells.add(trace.counts);
            rows.take({times_s[order[begin + k]], name, std::move(trace.rows)});
        }
        problems.throw_if_any();
        job.progress.advance(static_cast<double>(count));
    }
    rows.finish();
}

} // namespace rillstrand::record

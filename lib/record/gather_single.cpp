// SPDX-License-Identifier: Apache-2.0
#include "record/gather_parts.hpp"

#include "base/text.hpp"
#include "record/row_cursor.hpp"
#include "record/row_order.hpp"
#include "record/text_input.hpp"

#include <tbb/enumerable_thread_specific.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

namespace rillstrand::record {

namespace {

/// A million distances with five columns of twenty characters make 100 MB.
constexpr std::size_t largest_trace_bytes = std::size_t{256} << 20U;

/// One trace file in full.
struct SingleTrace {
    std::vector<double> distance_m; ///< increasing
    std::vector<Eigen::ArrayXf> rows;
    CellCounts counts;
    bool reversed = false;
    std::string wrong;
};

/// Reads trace files one after the other; keeps its memory from one to the next.
class SingleReader {
public:
    explicit SingleReader(const campaign::Record& record) : m_record{record} {}

    SingleTrace read(const TextHead& head) {
        m_head = &head;
        m_trace = {};
        m_values.assign(1 + head.power_cells.size(), {});
        for (auto& values : m_values)
            values.reserve(m_usual_rows);
        m_trace.distance_m.reserve(m_usual_rows);
        try {
            read_text(head.file, largest_trace_bytes, m_text);
            const CellReader cells{m_record, head.temperature_unit, head.decimal};
            read_rows(cells);
            close();
        } catch (const DataError& error) {
            m_trace.wrong = error.what();
        }
        m_usual_rows = std::max<std::size_t>(m_usual_rows, m_trace.distance_m.size());
        return std::move(m_trace);
    }

private:
    void read_rows(const CellReader& cells) {
        std::string_view text = m_text;
        const char* feed = nullptr;
        std::size_t number = 0;
        while (!text.empty()) {
            const std::string_view line = take_line(text, feed);
            if (++number < m_head->first_data_line)
                continue;
            if (take_fast(line, cells))
                continue;
            if (!is_comment(line, m_record.text))
                take(line, number, cells);
            if (m_trace.distance_m.size() > most_distances)
                refuse(m_head->file, number,
                       "has over 1000000 rows, too many for one trace; see record.layout");
        }
    }

    /// A row without quotation marks or anything wrong.
    bool take_fast(std::string_view line, const CellReader& cells) {
        const TextHead& head = *m_head;
        if (line.find('"') != std::string_view::npos || is_comment(line, m_record.text))
            return false;
        RowCursor row{line, head.delimiter};
        CellCounts counts;
        double distance = 0.0;
        for (std::size_t i = 0; i < head.cells; ++i) {
            if (!take_fast_cell(row, i, cells, distance, counts) ||
                row.step() != (i + 1 < head.cells))
                return false;
        }
        if (std::isnan(cells.seen(distance)))
            return false;
        m_trace.distance_m.push_back(to_metres(distance, head.distance_unit));
        for (std::size_t q = 0; q < m_values.size(); ++q)
            m_values[q].push_back(m_row_values[q]);
        m_trace.counts.add(counts);
        return true;
    }

    bool take_fast_cell(RowCursor& row, std::size_t cell, const CellReader& cells, double& distance,
                        CellCounts& counts) {
        const TextHead& head = *m_head;
        double value = 0.0;
        if (cell == head.distance_cell)
            return row.number(head.decimal, distance);
        if (cell == head.temperature_cell) {
            if (!row.number(head.decimal, value))
                return cells.temperature(row.cell(), m_row_values[0], counts);
            m_row_values[0] = cells.temperature(value, counts);
            return true;
        }
        for (std::size_t q = 0; q < head.power_cells.size(); ++q)
            if (cell == head.power_cells[q].second) {
                if (!cells.number(row.cell(), value))
                    return false;
                m_row_values[q + 1] = static_cast<float>(value);
                return true;
            }
        row.cell();
        return true;
    }

    void take(std::string_view line, std::size_t number, const CellReader& cells) {
        const TextHead& head = *m_head;
        split_cells(line, head.delimiter, m_row, head.cells);
        if (m_row.size() != head.cells)
            refuse(head.file, number, ragged(m_row.size(), head.cells));
        const auto refuse_cell = [&](std::size_t cell, const std::string& what) {
            refuse(head.file, number, no_number(m_row[cell], what, head.decimal));
        };
        double distance = 0.0;
        if (!cells.number(m_row[head.distance_cell], distance) || std::isnan(distance))
            refuse_cell(head.distance_cell, "distance");
        float value = 0.0F;
        if (!cells.temperature(m_row[head.temperature_cell], value, m_trace.counts))
            refuse_cell(head.temperature_cell, "temperature");
        m_trace.distance_m.push_back(to_metres(distance, head.distance_unit));
        m_values[0].push_back(value);
        for (std::size_t q = 0; q < head.power_cells.size(); ++q) {
            double power = 0.0;
            if (!cells.number(m_row[head.power_cells[q].second], power))
                refuse_cell(head.power_cells[q].second, "power");
            m_values[q + 1].push_back(static_cast<float>(power));
        }
    }

    void close() {
        auto& d = m_trace.distance_m;
        if (d.empty())
            throw DataError{m_head->file.string() + ": holds no row of numbers; remove the file or "
                                                    "complete it"};
        m_trace.reversed = d.size() > 1 && d.back() < d.front();
        if (m_trace.reversed) {
            std::reverse(d.begin(), d.end());
            for (auto& values : m_values)
                std::reverse(values.begin(), values.end());
        }
        for (std::size_t i = 1; i < d.size(); ++i)
            if (!(d[i] > d[i - 1])) {
                const std::size_t after = m_trace.reversed ? i - 1 : i;
                const std::size_t before = m_trace.reversed ? i : i - 1;
                throw DataError{
                    m_head->file.string() + ": distance " + text::number(d[after]) +
                    " m comes after " + text::number(d[before]) + " m; distances must " +
                    (m_trace.reversed ? "all decrease as the first and last do" : "increase") +
                    ", each once"};
            }
        for (const auto& values : m_values)
            m_trace.rows.emplace_back(Eigen::Map<const Eigen::ArrayXf>(
                values.data(), static_cast<Eigen::Index>(values.size())));
    }

    const campaign::Record& m_record;
    const TextHead* m_head = nullptr;
    SingleTrace m_trace;
    std::string m_text;
    std::vector<std::string_view> m_row;
    std::vector<std::vector<float>> m_values;
    std::array<float, 5> m_row_values{}; ///< temperature and powers of one row
    std::size_t m_usual_rows = 0;
};

/// Stamps of all files; repeated local hours are told by the order of the files' names.
std::vector<double> read_stamps(const TextJob& job) {
    std::vector<double> times_s(job.heads.size());
    Problems problems;
    ClockSequence sequence{job.stamps};
    constexpr std::size_t most_told = 20;
    for (std::size_t i = 0; i < job.heads.size() && problems.list().size() < most_told; ++i) {
        const TextHead& head = job.heads[i];
        try {
            times_s[i] = sequence.next(head.clock, head.stamp, head.file, 0);
        } catch (const DataError& error) {
            problems.add(error);
        }
    }
    problems.throw_if_any();
    sequence.finish();
    return times_s;
}

Eigen::ArrayXd as_array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(),
                                            static_cast<Eigen::Index>(values.size()));
}

/// Reads trace files in batches and hands them on in order of time.
class SingleGatherer {
public:
    SingleGatherer(const TextJob& job, std::vector<double> times_s)
        : m_job{job}, m_times_s{std::move(times_s)}, m_order(m_times_s.size()) {
        std::iota(m_order.begin(), m_order.end(), std::size_t{0});
        std::stable_sort(m_order.begin(), m_order.end(), [this](std::size_t a, std::size_t b) {
            return m_times_s[a] < m_times_s[b];
        });
        std::vector<double> sorted_s;
        for (const std::size_t i : m_order)
            sorted_s.push_back(m_times_s[i]);
        job.report.interval_s = tell_interval(job.record, sorted_s, job.report);
    }

    void run() {
        const TextHead& first_head = m_job.heads[m_order[0]];
        SingleTrace first = SingleReader{m_job.record}.read(first_head);
        if (!first.wrong.empty())
            throw DataError{first.wrong};
        m_first_m = first.distance_m;
        m_axis_m = as_array(m_first_m);
        const std::size_t n = m_order.size();
        RecordHead head{m_axis_m,
                        {Quantity::temperature},
                        static_cast<std::int64_t>(n),
                        m_job.report.interval_s};
        for (const auto& [quantity, cell] : first_head.power_cells)
            head.quantities.push_back(quantity);
        RowOrder rows{m_job.record, m_job.report, m_job.make_sink(head)};
        m_job.progress.stage("reading traces", static_cast<double>(n), "traces");
        constexpr std::size_t batch = 64;
        for (std::size_t begin = 0; begin < n; begin += batch) {
            const std::size_t count = std::min(batch, n - begin);
            read_batch(begin, count);
            hand_on(begin, rows);
            m_job.progress.advance(static_cast<double>(count));
        }
        tell_reversed(m_reversed, m_job.report);
        rows.finish();
    }

private:
    void read_batch(std::size_t begin, std::size_t count) {
        m_batch.assign(count, {});
        tbb::parallel_for(std::size_t{0}, count, [&](std::size_t k) {
            m_batch[k] = m_readers.local().read(m_job.heads[m_order[begin + k]]);
        });
    }

    void hand_on(std::size_t begin, RowOrder& rows) {
        Problems problems;
        for (std::size_t k = 0; k < m_batch.size(); ++k) {
            SingleTrace& trace = m_batch[k];
            const std::string name = m_job.heads[m_order[begin + k]].file.string();
            if (!trace.wrong.empty())
                problems.add(trace.wrong);
            if (!problems.empty())
                continue;
            if (trace.distance_m != m_first_m)
                align(trace, name);
            m_job.report.cells.add(trace.counts);
            m_reversed += trace.reversed ? 1 : 0;
            rows.take({m_times_s[m_order[begin + k]], name, std::move(trace.rows)});
        }
        problems.throw_if_any();
    }

    void align(SingleTrace& trace, const std::string& name) const {
        const Eigen::ArrayXd own_m = as_array(trace.distance_m);
        check_axes(m_axis_m, m_job.heads[m_order[0]].file.string(), own_m, name,
                   m_job.record.align);
        if (own_m.size() == m_axis_m.size() && (own_m - m_axis_m).abs().maxCoeff() < 1e-6)
            return;
        for (auto& row : trace.rows)
            row = on_axis(own_m, row, m_axis_m, m_job.record.align);
    }

    const TextJob& m_job;
    std::vector<double> m_times_s;
    std::vector<std::size_t> m_order;
    std::vector<double> m_first_m;
    Eigen::ArrayXd m_axis_m;
    std::vector<SingleTrace> m_batch;
    tbb::enumerable_thread_specific<SingleReader> m_readers{
        [this] { return SingleReader{m_job.record}; }};
    std::size_t m_reversed = 0;
};

} // namespace

void gather_single(const TextJob& job) {
    SingleGatherer{job, read_stamps(job)}.run();
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/gather_parts.hpp"

#include "record/row_cursor.hpp"
#include "record/row_order.hpp"
#include "record/wide_rows.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>

namespace fs = std::filesystem;

namespace rillstrand::record {

namespace {

constexpr std::size_t batch_bytes = std::size_t{8} << 20U;
constexpr std::size_t batch_rows = 512;

/// One row as numbers.
struct WideRow {
    Eigen::ArrayXf values;
    CellCounts counts;
    std::string wrong;
};

/// Reads rows of one file.
class WideRowReader {
public:
    WideRowReader(const campaign::Record& record, const TextHead& head)
        : m_head{head}, m_cells{record, head.temperature_unit, head.decimal} {}

    WideRow read(std::string_view line, std::size_t number) const {
        WideRow row;
        row.values.resize(static_cast<Eigen::Index>(m_head.distance_m.size()));
        if (!read_fast(line, row)) {
            row.counts = {};
            try {
                read_slowly(line, number, row);
            } catch (const DataError& error) {
                row.wrong = error.what();
            }
        }
        if (m_head.reversed)
            row.values.reverseInPlace();
        return row;
    }

private:
    /// @return false if anything is unusual
    bool read_fast(std::string_view line, WideRow& row) const {
        if (line.find('"') != std::string_view::npos)
            return false;
        RowCursor cursor{line, m_head.delimiter};
        const std::size_t time_end = m_head.time_cell + m_head.time_cells;
        Eigen::Index j = 0;
        for (std::size_t i = 0; i < m_head.cells; ++i) {
            double value = 0.0;
            if (i >= m_head.time_cell && i < time_end)
                cursor.cell();
            else if (cursor.number(m_head.decimal, value))
                row.values(j++) = m_cells.temperature(value, row.counts);
            else if (m_cells.temperature(cursor.cell(), row.values(j), row.counts))
                ++j;
            else
                return false;
            // An empty cell at the end of a row between blanks cannot be seen.
            if (cursor.step() != (i + 1 < m_head.cells))
                return false;
        }
        return true;
    }

    void read_slowly(std::string_view line, std::size_t number, WideRow& row) const {
        std::vector<std::string_view> cells;
        split_cells(line, m_head.delimiter, cells, m_head.cells);
        if (cells.size() != m_head.cells)
            refuse(m_head.file, number, ragged(cells.size(), m_head.cells));
        const std::size_t time_end = m_head.time_cell + m_head.time_cells;
        Eigen::Index j = 0;
        for (std::size_t i = 0; i < cells.size(); ++i) {
            if (i >= m_head.time_cell && i < time_end)
                continue;
            if (!m_cells.temperature(cells[i], row.values(j), row.counts))
                refuse(m_head.file, number,
                       "column " + std::to_string(i + 1) + ": " +
                           no_number(cells[i], "temperature", m_head.decimal));
            ++j;
        }
    }

    const TextHead& m_head;
    CellReader m_cells;
};

class WideGatherer {
public:
    explicit WideGatherer(const TextJob& job) : m_job{job} {
        std::size_t reversed = 0;
        for (const auto& head : job.heads) {
            m_readers.emplace_back(job.record, head);
            m_axes.emplace_back(Eigen::Map<const Eigen::ArrayXd>(
                head.distance_m.data(), static_cast<Eigen::Index>(head.distance_m.size())));
            check_axes(m_axes.front(), job.heads.front().file.string(), m_axes.back(),
                       head.file.string(), job.record.align);
            m_same.push_back(m_axes.back().size() == m_axes.front().size() &&
                             (m_axes.back() - m_axes.front()).abs().maxCoeff() < 1e-6);
            if (m_same.back() && m_axes.size() > 1)
                m_axes.back().resize(0); // a season of files has one axis, not one each
            reversed += head.reversed ? 1 : 0;
        }
        tell_reversed(reversed, job.report);
        find_rows();
    }

    void run() {
        RowOrder rows{m_job.record, m_job.report,
                      m_job.make_sink({m_axes.front(),
                                       {Quantity::temperature},
                                       static_cast<std::int64_t>(m_places.size()),
                                       m_job.report.interval_s})};
        m_job.progress.stage("reading traces", static_cast<double>(m_places.size()), "traces");
        RowFetcher fetcher{m_job, m_places};
        for (std::size_t begin = 0; begin < m_places.size();) {
            const std::size_t end = batch_end(begin);
            read_batch(fetcher.fetch(begin, end), begin);
            hand_on(begin, rows);
            m_job.progress.advance(static_cast<double>(end - begin));
            begin = end;
        }
        rows.finish();
    }

private:
    void find_rows() {
        double bytes = 0.0;
        for (const auto& head : m_job.heads)
            bytes += static_cast<double>(fs::file_size(head.file));
        m_job.progress.stage("finding traces", bytes * 1e-6, "MB");
        m_places = index_rows(m_job);
        if (m_places.empty())
            throw DataError{m_job.heads.front().file.string() + ": holds no row of numbers"};
        const auto earlier = [](const RowPlace& a, const RowPlace& b) {
            return a.time_s < b.time_s;
        };
        std::int64_t backwards = 0;
        for (std::size_t i = 1; i < m_places.size(); ++i)
            if (m_places[i].file == m_places[i - 1].file && earlier(m_places[i], m_places[i - 1]))
                ++backwards;
        if (backwards > 0)
            m_job.report.warnings.push_back(
                {"record-time-backwards", "time runs backwards " + std::to_string(backwards) +
                                              (backwards == 1 ? " time" : " times") +
                                              " inside a file; the traces were sorted by time"});
        std::stable_sort(m_places.begin(), m_places.end(), earlier);
        std::vector<double> times_s;
        times_s.reserve(m_places.size());
        for (const auto& place : m_places)
            times_s.push_back(place.time_s);
        m_job.report.interval_s = tell_interval(m_job.record, std::move(times_s), m_job.report);
    }

    std::size_t batch_end(std::size_t begin) const {
        std::size_t bytes = 0, end = begin;
        while (end < m_places.size() && end - begin < batch_rows &&
               (end == begin || bytes + m_places[end].length <= batch_bytes))
            bytes += m_places[end++].length;
        return end;
    }

    void read_batch(const std::vector<std::string_view>& lines, std::size_t begin) {
        m_batch.assign(lines.size(), {});
        tbb::parallel_for(std::size_t{0}, lines.size(), [&](std::size_t k) {
            const RowPlace& place = m_places[begin + k];
            m_batch[k] = m_readers[place.file].read(lines[k], place.line);
            if (!m_same[place.file] && m_batch[k].wrong.empty())
                m_batch[k].values = on_axis(m_axes[place.file], m_batch[k].values, m_axes.front(),
                                            m_job.record.align);
        });
    }

    void hand_on(std::size_t begin, RowOrder& rows) {
        Problems problems;
        constexpr std::size_t most_told = 20;
        for (std::size_t k = 0; k < m_batch.size() && problems.list().size() < most_told; ++k) {
            WideRow& row = m_batch[k];
            const RowPlace& place = m_places[begin + k];
            if (!row.wrong.empty())
                problems.add(row.wrong);
            if (!problems.empty())
                continue;
            m_job.report.cells.add(row.counts);
            rows.take({place.time_s,
                       m_job.heads[place.file].file.string() + ":" + std::to_string(place.line),
                       {std::move(row.values)}});
        }
        problems.throw_if_any();
    }

    const TextJob& m_job;
    std::vector<WideRowReader> m_readers;
    std::vector<Eigen::ArrayXd> m_axes;
    std::vector<bool> m_same;
    std::vector<RowPlace> m_places;
    std::vector<WideRow> m_batch;
};

} // namespace

void gather_wide(const TextJob& job) {
    WideGatherer{job}.run();
}

} // namespace rillstrand::record

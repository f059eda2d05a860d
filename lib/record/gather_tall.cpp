// SPDX-License-Identifier: Apache-2.0
#include "record/gather_parts.hpp"

#include "record/row_order.hpp"
#include "record/text_input.hpp"

#include <fcntl.h>
#include <sys/mman.h>
#include <unistd.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <unordered_map>

namespace fs = std::filesystem;

namespace rillstrand::record {

namespace {

/// One row of a tall table.
struct TallRow {
    double time_s = 0.0;
    double distance_m = 0.0;
    float temperature_degC = 0.0F;
    std::vector<float> powers;
};

/// Goes through all rows of all files in order.
template <class Use> void each_row(const TextJob& job, bool count_cells, const Use& use) {
    std::vector<std::string_view> cells;
    for (const auto& head : job.heads) {
        const CellReader reader{job.record, head.temperature_unit, head.decimal};
        LineSource source{head.file};
        std::string_view line;
        std::string last_stamp;
        TallRow row;
        row.powers.resize(head.power_cells.size());
        std::optional<double> previous_s;
        CellCounts counts;
        while (source.next(line)) {
            const std::size_t number = source.number();
            if (number < head.first_data_line || is_comment(line, job.record.text))
                continue;
            split_cells(line, head.delimiter, cells);
            if (cells.size() != head.cells)
                refuse(head.file, number,
                       "has " + std::to_string(cells.size()) + " cells where the header has " +
                           std::to_string(head.cells) + "; complete or remove the line");
            if (cells[head.time_cell] != last_stamp) {
                last_stamp = cells[head.time_cell];
                row.time_s = read_stamp(job.stamps, last_stamp, previous_s, head.file, number);
                previous_s = row.time_s;
            }
            double distance = 0.0;
            if (!reader.number(cells[head.distance_cell], distance) || std::isnan(distance))
                refuse(head.file, number,
                       "'" + std::string{cells[head.distance_cell]} +
                           "' is no distance; correct it");
            row.distance_m = to_metres(distance, head.distance_unit);
            if (!reader.temperature(cells[head.temperature_cell], row.temperature_degC, counts))
                refuse(head.file, number,
                       "'" + std::string{cells[head.temperature_cell]} +
                           "' is no temperature; correct it, or add the text to record.missing");
            for (std::size_t q = 0; q < head.power_cells.size(); ++q) {
                double power = 0.0;
                if (!reader.number(cells[head.power_cells[q].second], power))
                    refuse(head.file, number,
                           "'" + std::string{cells[head.power_cells[q].second]} +
                               "' is no power; correct it");
                row.powers[q] = static_cast<float>(power);
            }
            use(row, head.file, number);
        }
        if (count_cells)
            job.report.cells.add(counts);
    }
}

/// The axes of a tall table and whether its rows come trace by trace.
struct TallAxes {
    std::vector<double> times_s;
    std::vector<double> distances_m;
    std::unordered_map<double, Eigen::Index> place_of;
    bool in_order = true; ///< times never fall and no place comes twice in a trace
};

TallAxes find_axes(const TextJob& job) {
    constexpr std::size_t most = 200000000;
    TallAxes axes;
    std::unordered_map<double, char> times, distances;
    double last_s = -std::numeric_limits<double>::infinity();
    std::unordered_map<double, double> seen_at; // distance: last time
    each_row(job, true, [&](const TallRow& row, const fs::path& file, std::size_t number) {
        if (row.time_s < last_s)
            axes.in_order = false;
        last_s = row.time_s;
        times.emplace(row.time_s, 0);
        distances.emplace(row.distance_m, 0);
        const auto [seen, fresh] = seen_at.emplace(row.distance_m, row.time_s);
        if (!fresh && seen->second == row.time_s)
            axes.in_order = false;
        seen->second = row.time_s;
        if (distances.size() > 1000000 || times.size() > most)
            refuse(file, number,
                   "the table has more than 1000000 different distances; are time and "
                   "distance columns exchanged?");
    });
    for (const auto& [value, unused] : times)
        axes.times_s.push_back(value);
    for (const auto& [value, unused] : distances)
        axes.distances_m.push_back(value);
    std::sort(axes.times_s.begin(), axes.times_s.end());
    std::sort(axes.distances_m.begin(), axes.distances_m.end());
    for (std::size_t j = 0; j < axes.distances_m.size(); ++j)
        axes.place_of.emplace(axes.distances_m[j], static_cast<Eigen::Index>(j));
    return axes;
}

/// A matrix of floats in a temporary file, for tables in disorder: larger than memory if need be.
class ScratchMatrix {
public:
    ScratchMatrix(const fs::path& scratch, std::size_t count) : m_bytes{count * sizeof(float)} {
        std::string name = (scratch / "tall-XXXXXX").string();
        const int fd = ::mkstemp(name.data());
        if (fd < 0)
            throw MachineError{name + ": cannot be made; free some space"};
        ::unlink(name.c_str());
        if (::posix_fallocate(fd, 0, static_cast<off_t>(m_bytes)) != 0) {
            ::close(fd);
            throw MachineError{scratch.string() + ": no space for " +
                               std::to_string(m_bytes >> 20U) +
                               " MB of temporary file; sort the table by time or free some space"};
        }
        void* mapped = ::mmap(nullptr, m_bytes, PROT_READ | PROT_WRITE, MAP_SHARED, fd, 0);
        ::close(fd);
        if (mapped == MAP_FAILED)
            throw MachineError{scratch.string() + ": a temporary file cannot be mapped"};
        m_values = static_cast<float*>(mapped);
        std::fill(m_values, m_values + count, std::numeric_limits<float>::quiet_NaN());
    }
    ScratchMatrix(const ScratchMatrix&) = delete;
    ScratchMatrix& operator=(const ScratchMatrix&) = delete;
    ScratchMatrix(ScratchMatrix&&) = delete;
    ScratchMatrix& operator=(ScratchMatrix&&) = delete;
    ~ScratchMatrix() { ::munmap(m_values, m_bytes); }
    float* data() { return m_values; }

private:
    std::size_t m_bytes;
    float* m_values = nullptr;
};

class TallGatherer {
public:
    TallGatherer(const TextJob& job, const TallAxes& axes)
        : m_job{job}, m_axes{axes}, m_quantities{1 + job.heads.front().power_cells.size()},
          m_rows{job.record, job.report, job.make_sink(head())} {}

    void in_order() {
        Trace trace = empty_trace(0.0);
        bool any = false;
        each_row(m_job, false, [&](const TallRow& row, const fs::path& file, std::size_t number) {
            if (!any || row.time_s != trace.time_s) {
                if (any)
                    hand_on(std::move(trace));
                trace = empty_trace(row.time_s);
                trace.origin = file.string() + ":" + std::to_string(number);
                any = true;
            }
            const Eigen::Index j = m_axes.place_of.at(row.distance_m);
            trace.rows[0](j) = row.temperature_degC;
            for (std::size_t q = 0; q < row.powers.size(); ++q)
                trace.rows[q + 1](j) = row.powers[q];
        });
        hand_on(std::move(trace));
        m_rows.finish();
    }

    void in_disorder() {
        const std::size_t n_place = m_axes.distances_m.size();
        const std::size_t stride = n_place * m_quantities;
        ScratchMatrix matrix{m_job.scratch, m_axes.times_s.size() * stride};
        each_row(m_job, false, [&](const TallRow& row, const fs::path& file, std::size_t number) {
            const auto i = static_cast<std::size_t>(
                std::lower_bound(m_axes.times_s.begin(), m_axes.times_s.end(), row.time_s) -
                m_axes.times_s.begin());
            const auto j = static_cast<std::size_t>(m_axes.place_of.at(row.distance_m));
            float* cell = matrix.data() + i * stride + j;
            put(*cell, row.temperature_degC, file, number);
            for (std::size_t q = 0; q < row.powers.size(); ++q)
                cell[(q + 1) * n_place] = row.powers[q];
        });
        for (std::size_t i = 0; i < m_axes.times_s.size(); ++i) {
            Trace trace = empty_trace(m_axes.times_s[i]);
            trace.origin = m_job.heads.front().file.string();
            for (std::size_t q = 0; q < m_quantities; ++q)
                trace.rows[q] = Eigen::Map<const Eigen::ArrayXf>(
                    matrix.data() + i * stride + q * n_place, static_cast<Eigen::Index>(n_place));
            hand_on(std::move(trace));
        }
        if (m_repeated > 0)
            m_job.report.warnings.push_back(
                {"record-duplicates",
                 std::to_string(m_repeated) +
                     " rows came twice with the same value; each is kept once"});
        m_rows.finish();
    }

private:
    RecordHead head() const {
        RecordHead result;
        result.distance_m = Eigen::Map<const Eigen::ArrayXd>(
            m_axes.distances_m.data(), static_cast<Eigen::Index>(m_axes.distances_m.size()));
        result.quantities.push_back(Quantity::temperature);
        for (const auto& [quantity, cell] : m_job.heads.front().power_cells)
            result.quantities.push_back(quantity);
        result.traces = static_cast<std::int64_t>(m_axes.times_s.size());
        result.interval_s = m_job.report.interval_s;
        return result;
    }

    Trace empty_trace(double time_s) const {
        Trace trace;
        trace.time_s = time_s;
        trace.rows.assign(m_quantities, Eigen::ArrayXf::Constant(
                                            static_cast<Eigen::Index>(m_axes.distances_m.size()),
                                            std::numeric_limits<float>::quiet_NaN()));
        return trace;
    }

    void put(float& cell, float value, const fs::path& file, std::size_t number) {
        if (std::isnan(cell)) {
            cell = value;
            return;
        }
        if (cell == value || std::isnan(value)) {
            ++m_repeated;
            return;
        }
        if (m_job.record.duplicates == campaign::Duplicates::refuse)
            refuse(file, number,
                   "this time and distance stood before with another value; take one "
                   "out, or say record.duplicates = \"first\" or \"mean\"");
        if (m_job.record.duplicates == campaign::Duplicates::mean)
            cell = 0.5F * (cell + value);
    }

    void hand_on(Trace trace) {
        m_rows.take(std::move(trace));
        m_job.progress.advance(1.0);
    }

    const TextJob& m_job;
    const TallAxes& m_axes;
    std::size_t m_quantities;
    RowOrder m_rows;
    std::int64_t m_repeated = 0;
};

} // namespace

void gather_tall(const TextJob& job) {
    job.progress.stage("finding traces", 0.0, "rows");
    const TallAxes axes = find_axes(job);
    if (axes.times_s.empty())
        throw DataError{job.heads.front().file.string() + ": holds no row of numbers"};
    job.report.interval_s = tell_interval(job.record, axes.times_s, job.report);
    job.progress.stage("reading traces", static_cast<double>(axes.times_s.size()), "traces");
    TallGatherer gatherer{job, axes};
    if (axes.in_order)
        gatherer.in_order();
    else
        gatherer.in_disorder();
}

} // namespace rillstrand::record

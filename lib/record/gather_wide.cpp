// SPDX-License-Identifier: Apache-2.0
#include "record/gather_parts.hpp"

#include "record/row_order.hpp"
#include "record/text_input.hpp"

#include <zlib.h>

#include <algorithm>
#include <cmath>
#include <fstream>

namespace fs = std::filesystem;

namespace rillstrand::record {

namespace {

/// Where one row of a wide table lies.
struct RowPlace {
    double time_s;
    std::uint64_t offset;
    std::uint32_t length;
    std::uint32_t file;
    std::uint32_t line;
};

bool is_gzip(const fs::path& file) {
    std::ifstream stream{file, std::ios::binary};
    return stream.get() == 0x1F && stream.get() == 0x8B;
}

/// A gzip table is unpacked once, so that its rows can be fetched in order of time.
fs::path plain_copy(const fs::path& file, const fs::path& scratch, std::size_t number) {
    if (!is_gzip(file))
        return file;
    const fs::path copy = scratch / ("unpacked-" + std::to_string(number) + ".txt");
    std::ofstream out{copy, std::ios::binary};
    gzFile in = gzopen(file.c_str(), "rb");
    std::vector<char> buffer(1U << 20U);
    for (;;) {
        const int got = gzread(in, buffer.data(), static_cast<unsigned>(buffer.size()));
        if (got <= 0)
            break;
        out.write(buffer.data(), got);
    }
    gzclose(in); // a stream that is cut short was refused when its rows were indexed
    out.close();
    if (!out)
        throw MachineError{copy.string() + ": cannot be written; free some space"};
    return copy;
}

std::vector<RowPlace> index_rows(const TextJob& job) {
    std::vector<RowPlace> places;
    std::vector<std::string_view> cells;
    for (std::size_t f = 0; f < job.heads.size(); ++f) {
        const TextHead& head = job.heads[f];
        LineSource source{head.file};
        std::string_view line;
        std::optional<double> previous_s;
        std::size_t before = source.offset();
        while (source.next(line)) {
            const std::size_t moved = source.offset() - before;
            before = source.offset();
            job.progress.advance(static_cast<double>(moved) * 1e-6);
            if (source.number() < head.first_data_line || is_comment(line, job.record.text))
                continue;
            std::string_view stamp;
            if (head.time_cell == 0 && head.delimiter != ' ' && line.front() != '"') {
                stamp = trim(line.substr(0, line.find(head.delimiter)));
            } else {
                split_cells(line, head.delimiter, cells);
                if (cells.size() <= head.time_cell)
                    refuse(head.file, source.number(), "has no time cell; complete or remove it");
                stamp = cells[head.time_cell];
            }
            const double time_s =
                read_stamp(job.stamps, stamp, previous_s, head.file, source.number());
            previous_s = time_s;
            places.push_back({time_s, source.offset(), static_cast<std::uint32_t>(line.size()),
                              static_cast<std::uint32_t>(f),
                              static_cast<std::uint32_t>(source.number())});
        }
    }
    return places;
}

class WideReader {
public:
    explicit WideReader(const TextJob& job) : m_job{job} {
        for (const auto& head : job.heads) {
            m_cells.emplace_back(job.record, head.temperature_unit, head.decimal);
            m_axes.push_back(Eigen::Map<const Eigen::ArrayXd>(
                head.distance_m.data(), static_cast<Eigen::Index>(head.distance_m.size())));
            check_axes(m_axes.front(), job.heads.front().file.string(), m_axes.back(),
                       head.file.string(), job.record.align);
            m_same.push_back(m_axes.back().size() == m_axes.front().size() &&
                             (m_axes.back() - m_axes.front()).abs().maxCoeff() < 1e-6);
        }
        m_streams.resize(job.heads.size());
    }

    const Eigen::ArrayXd& axis() const { return m_axes.front(); }

    Trace read(const RowPlace& place) {
        const TextHead& head = m_job.heads[place.file];
        fetch(place);
        split_cells(m_line, head.delimiter, m_row);
        if (m_row.size() != head.cells)
            refuse(head.file, place.line,
                   "has " + std::to_string(m_row.size()) + " cells where the header has " +
                       std::to_string(head.cells) + "; complete or remove the line");
        Eigen::ArrayXf row(m_axes[place.file].size());
        Eigen::Index j = 0;
        for (std::size_t i = 0; i < m_row.size(); ++i) {
            if (i == head.time_cell)
                continue;
            float value = 0.0F;
            if (!m_cells[place.file].temperature(m_row[i], value, m_job.report.cells))
                refuse(head.file, place.line,
                       "column " + std::to_string(i + 1) + ": '" + std::string{m_row[i]} +
                           "' is no temperature; correct it, or add the text to record.missing");
            row(head.reversed ? row.size() - 1 - j : j) = value;
            ++j;
        }
        if (!m_same[place.file])
            row = on_axis(m_axes[place.file], row, m_axes.front(), m_job.record.align);
        return {
            place.time_s, head.file.string() + ":" + std::to_string(place.line), {std::move(row)}};
    }

private:
    void fetch(const RowPlace& place) {
        auto& stream = m_streams[place.file];
        if (!stream.is_open()) {
            // Few files are open at a time, however many a record has.
            if (m_open.size() >= 64) {
                m_streams[m_open.front()].close();
                m_open.erase(m_open.begin());
            }
            const fs::path& file = m_job.heads[place.file].file;
            stream.open(plain_copy(file, m_job.scratch, place.file), std::ios::binary);
            m_open.push_back(place.file);
        }
        m_line.resize(place.length);
        stream.seekg(static_cast<std::streamoff>(place.offset));
        stream.read(m_line.data(), place.length);
        if (stream.gcount() != static_cast<std::streamsize>(place.length))
            throw DataError{m_job.heads[place.file].file.string() +
                            ": changed while it was read; run again when it is complete"};
    }

    const TextJob& m_job;
    std::vector<CellReader> m_cells;
    std::vector<Eigen::ArrayXd> m_axes;
    std::vector<bool> m_same;
    std::vector<std::ifstream> m_streams;
    std::vector<std::uint32_t> m_open;
    std::string m_line;
    std::vector<std::string_view> m_row;
};

} // namespace

void gather_wide(const TextJob& job) {
    double bytes = 0.0;
    for (const auto& head : job.heads)
        bytes += static_cast<double>(fs::file_size(head.file));
    job.progress.stage("finding traces", bytes * 1e-6, "MB");
    WideReader reader{job};
    std::vector<RowPlace> places = index_rows(job);
    if (places.empty())
        throw DataError{job.heads.front().file.string() + ": holds no row of numbers"};
    const auto earlier = [](const RowPlace& a, const RowPlace& b) { return a.time_s < b.time_s; };
    std::int64_t backwards = 0;
    for (std::size_t i = 1; i < places.size(); ++i)
        if (places[i].file == places[i - 1].file && earlier(places[i], places[i - 1]))
            ++backwards;
    if (backwards > 0)
        job.report.warnings.push_back(
            {"record-time-backwards", "time runs backwards " + std::to_string(backwards) +
                                          " times inside a file; the traces were sorted by time"});
    std::stable_sort(places.begin(), places.end(), earlier);
    std::vector<double> times_s;
    times_s.reserve(places.size());
    for (const auto& place : places)
        times_s.push_back(place.time_s);
    job.report.interval_s = tell_interval(job.record, std::move(times_s), job.report);
    RowOrder rows{job.record, job.report,
                  job.make_sink({reader.axis(),
                                 {Quantity::temperature},
                                 static_cast<std::int64_t>(places.size()),
                                 job.report.interval_s})};
    job.progress.stage("reading traces", static_cast<double>(places.size()), "traces");
    for (const auto& place : places) {
        rows.take(reader.read(place));
        job.progress.advance(1.0);
    }
    rows.finish();
}

} // namespace rillstrand::record

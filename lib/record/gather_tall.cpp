// SPDX-License-Identifier: Apache-2.0
#include "record/gather_parts.hpp"

#include "base/text.hpp"
#include "record/distinct.hpp"
#include "record/row_order.hpp"
#include "record/tall_merge.hpp"
#include "record/tall_rows.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>

namespace fs = std::filesystem;

namespace rillstrand::record {

namespace {

constexpr std::size_t most_times = 5000000;

/// Finds axes and order of one file.
class AxesFinder {
public:
    explicit AxesFinder(const TextHead& head) : m_head{head} {}

    void take(double time_s, const TallBlock& block, const TallGroup& group,
              std::size_t first_line) {
        if (m_rows == 0 || time_s != m_last_s) {
            m_times.add(time_s);
            m_in_order = m_in_order && (m_rows == 0 || time_s > m_last_s);
            m_direction = 0;
            m_last_m = std::numeric_limits<double>::quiet_NaN();
            m_last_s = time_s;
        }
        for (std::size_t i = group.first; i < group.first + group.count; ++i) {
            const double d = block.distance_m[i];
            m_distances.add(d);
            if (!std::isnan(m_last_m)) {
                const int direction = d > m_last_m ? 1 : d < m_last_m ? -1 : 2;
                if (m_direction == 0)
                    m_direction = direction;
                // Distances that do not run one way may come twice.
                m_in_order = m_in_order && direction == m_direction && direction != 2;
            }
            m_last_m = d;
        }
        m_rows += group.count;
        check_size(first_line + block.line[group.first]);
    }

    TallFile finish() {
        TallFile file;
        file.head = &m_head;
        file.times_s = m_times.take();
        file.distance_m = m_distances.take();
        file.in_order = m_in_order;
        file.rows = m_rows;
        return file;
    }

private:
    void check_size(std::size_t line) const {
        if (m_distances.size() > most_distances)
            refuse(m_head.file, line,
                   "the table has over 1000000 different distances; see "
                   "record.text.distance_column");
        if (m_times.size() > most_times)
            refuse(m_head.file, line,
                   "the table has over 5000000 different times, more than are taken from a tall "
                   "table; part it into several campaigns or write it wide");
    }

    const TextHead& m_head;
    Distinct m_times, m_distances;
    bool m_in_order = true;
    std::size_t m_rows = 0;
    double m_last_s = 0.0;
    double m_last_m = 0.0;
    int m_direction = 0;
};

std::vector<TallFile> find_axes(const TextJob& job) {
    std::vector<TallFile> files;
    ClockSequence sequence{job.stamps};
    for (const auto& head : job.heads) {
        AxesFinder finder{head};
        const ClockSequence before = sequence;
        GroupClock clock{job, sequence, head};
        job.report.cells.add(each_group(
            job, head, [&](const TallBlock& block, const TallGroup& group, std::size_t line) {
                finder.take(clock.time_s(block, group, line), block, group, line);
            }));
        files.push_back(finder.finish());
        files.back().clock.emplace(before);
        if (files.back().rows == 0)
            throw DataError{head.file.string() + ": holds no row of numbers; remove the file or "
                                                 "complete it"};
    }
    sequence.finish();
    return files;
}

Eigen::ArrayXd as_array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(),
                                            static_cast<Eigen::Index>(values.size()));
}

/// Refuses files of different distances, and tables that would be nearly empty.
void check_files(const TextJob& job, const std::vector<TallFile>& files) {
    Problems problems;
    for (const auto& file : files) {
        try {
            check_axes(as_array(files.front().distance_m), files.front().head->file.string(),
                       as_array(file.distance_m), file.head->file.string(), job.record.align);
        } catch (const DataError& error) {
            problems.add(error);
        }
        constexpr std::size_t large = 10000000, emptiest = 100;
        const std::size_t cells = file.times_s.size() * file.distance_m.size();
        if (cells > large && cells / emptiest > file.rows)
            problems.add(file.head->file.string() + ": has " + std::to_string(file.times_s.size()) +
                         " times and " + std::to_string(file.distance_m.size()) +
                         " distances, but only " + std::to_string(file.rows) +
                         " rows: times or distances do not come again; see record.text");
    }
    problems.throw_if_any();
}

/// Whether the rows of all files come trace by trace, files being taken by their first time.
bool in_order(const std::vector<TallFile>& files, std::vector<std::size_t>& order) {
    order.resize(files.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::stable_sort(order.begin(), order.end(), [&files](std::size_t a, std::size_t b) {
        return files[a].times_s.front() < files[b].times_s.front();
    });
    for (std::size_t i = 0; i < order.size(); ++i) {
        if (!files[order[i]].in_order)
            return false;
        if (i > 0 && files[order[i]].times_s.front() < files[order[i - 1]].times_s.back())
            return false;
    }
    return true;
}

void put(TallTrace& trace, std::size_t place, const float* values) {
    trace.present[place] = true;
    for (std::size_t q = 0; q < trace.rows.size(); ++q)
        trace.rows[q](static_cast<Eigen::Index>(place)) = values[q];
}

/// Reads a record whose rows come in order, a trace at a time.
void stream(const TextJob& job, const std::vector<TallFile>& files,
            const std::vector<std::size_t>& order, TallMerge& merge) {
    for (const std::size_t f : order) {
        const TallFile& file = files[f];
        ClockSequence sequence = *file.clock;
        GroupClock clock{job, sequence, *file.head};
        PlaceFinder places{file.distance_m};
        std::optional<TallTrace> trace;
        each_group(job, *file.head,
                   [&](const TallBlock& block, const TallGroup& group, std::size_t line) {
                       const double time_s = clock.time_s(block, group, line);
                       if (!trace || trace->time_s != time_s) {
                           if (trace)
                               merge.take(std::move(*trace));
                           trace = merge.empty_trace(f, time_s, line + block.line[group.first]);
                       }
                       for (std::size_t i = group.first; i < group.first + group.count; ++i)
                           put(*trace, places.find(block.distance_m[i]),
                               block.values.data() + i * merge.quantities());
                   });
        if (trace)
            merge.take(std::move(*trace));
    }
}

} // namespace

void gather_tall(const TextJob& job) {
    double bytes = 0.0;
    for (const auto& head : job.heads)
        bytes += static_cast<double>(fs::file_size(head.file));
    job.progress.stage("finding traces", bytes * 1e-6, "MB");
    const std::vector<TallFile> files = find_axes(job);
    check_files(job, files);
    std::vector<double> times_s;
    for (const auto& file : files)
        times_s.insert(times_s.end(), file.times_s.begin(), file.times_s.end());
    std::sort(times_s.begin(), times_s.end());
    times_s.erase(std::unique(times_s.begin(), times_s.end()), times_s.end());
    job.report.interval_s = tell_interval(job.record, std::move(times_s), job.report);
    TallMerge merge{job, files};
    std::vector<std::size_t> order;
    if (in_order(files, order)) {
        job.progress.stage("reading traces", bytes * 1e-6, "MB");
        stream(job, files, order, merge);
    } else {
        job.progress.stage("sorting rows", bytes * 1e-6, "MB");
        gather_in_disorder(job, files, merge);
    }
    merge.finish();
}

} // namespace rillstrand::record

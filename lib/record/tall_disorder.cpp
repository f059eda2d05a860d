// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"
#include "record/distinct.hpp"
#include "record/spill.hpp"
#include "record/tall_merge.hpp"

#include <algorithm>
#include <cmath>
#include <map>

namespace rillstrand::record {

namespace {

constexpr std::size_t bucket_bytes = std::size_t{24} << 20U; ///< of the traces of one bucket
constexpr std::size_t most_buckets = 4096;

/// A trace of one file, in the order in which traces are handed on.
struct TraceKey {
    double time_s = 0.0;
    std::uint32_t file = 0;
};

bool same(float a, float b) {
    return a == b || (std::isnan(a) && std::isnan(b));
}

/// Sums of rows of one time and place that differ.
struct Sums {
    std::vector<double> sum;
    std::vector<int> count;
    void add(const std::vector<float>& values) {
        sum.resize(values.size());
        count.resize(values.size());
        for (std::size_t q = 0; q < values.size(); ++q)
            if (!std::isnan(values[q])) {
                sum[q] += static_cast<double>(values[q]);
                ++count[q];
            }
    }
};

class Sorter {
public:
    Sorter(const TextJob& job, const std::vector<TallFile>& files, TallMerge& merge)
        : m_job{job}, m_files{files}, m_merge{merge}, m_quantities{merge.quantities()} {
        std::size_t widest = 0;
        for (std::size_t f = 0; f < files.size(); ++f) {
            for (const double time_s : files[f].times_s)
                m_keys.push_back({time_s, static_cast<std::uint32_t>(f)});
            widest = std::max(widest, files[f].distance_m.size());
        }
        std::stable_sort(m_keys.begin(), m_keys.end(),
                         [](const TraceKey& a, const TraceKey& b) { return a.time_s < b.time_s; });
        const std::size_t trace_bytes =
            std::max<std::size_t>(widest, 1) * m_quantities * sizeof(float);
        m_bucket_traces = std::max(
            {std::size_t{1}, bucket_bytes / trace_bytes, m_keys.size() / most_buckets + 1});
        m_trace_of.resize(files.size());
        for (std::size_t i = 0; i < m_keys.size(); ++i)
            m_trace_of[m_keys[i].file].push_back(static_cast<std::uint32_t>(i));
    }

    void run() {
        const std::size_t buckets = (m_keys.size() + m_bucket_traces - 1) / m_bucket_traces;
        Spill spill{m_job.scratch, buckets, m_quantities};
        for (std::size_t f = 0; f < m_files.size(); ++f)
            sort_rows(f, spill);
        for (std::size_t b = 0; b < buckets; ++b)
            hand_on(b, spill);
        if (m_repeated > 0)
            m_job.report.warnings.push_back(
                {"record-duplicates", std::to_string(m_repeated) +
                                          (m_repeated == 1 ? " row is" : " rows are") +
                                          " of a time and distance that stood before in the same "
                                          "file; each is kept once"});
    }

private:
    void sort_rows(std::size_t f, Spill& spill) const {
        const TallFile& file = m_files[f];
        ClockSequence sequence = *file.clock;
        GroupClock clock{m_job, sequence, *file.head};
        PlaceFinder times{file.times_s}, places{file.distance_m};
        each_group(m_job, *file.head,
                   [&](const TallBlock& block, const TallGroup& group, std::size_t line) {
                       const double time_s = clock.time_s(block, group, line);
                       const std::size_t trace = m_trace_of[f][times.find(time_s)];
                       SpillRow row;
                       row.trace = static_cast<std::uint32_t>(trace % m_bucket_traces);
                       for (std::size_t i = group.first; i < group.first + group.count; ++i) {
                           row.place = static_cast<std::uint32_t>(places.find(block.distance_m[i]));
                           row.line = static_cast<std::uint32_t>(line + block.line[i]);
                           spill.add(trace / m_bucket_traces, row,
                                     block.values.data() + i * m_quantities);
                       }
                   });
    }

    void hand_on(std::size_t bucket, const Spill& spill) {
        const std::size_t begin = bucket * m_bucket_traces;
        const std::size_t end = std::min(begin + m_bucket_traces, m_keys.size());
        std::vector<TallTrace> traces;
        for (std::size_t i = begin; i < end; ++i)
            traces.push_back(m_merge.empty_trace(m_keys[i].file, m_keys[i].time_s, 0));
        std::map<std::pair<std::uint32_t, std::uint32_t>, Sums> sums;
        spill.each(bucket, [&](const SpillRow& row, const float* values) {
            TallTrace& trace = traces[row.trace];
            const auto j = static_cast<Eigen::Index>(row.place);
            if (trace.line == 0)
                trace.line = row.line;
            if (!trace.present[row.place]) {
                trace.present[row.place] = true;
                for (std::size_t q = 0; q < m_quantities; ++q)
                    trace.rows[q](j) = values[q];
                return true;
            }
            ++m_repeated;
            for (std::size_t q = 0; q < m_quantities; ++q)
                if (!same(trace.rows[q](j), values[q])) {
                    settle(bucket, spill, trace, row, values, sums);
                    break;
                }
            return true;
        });
        for (const auto& [key, sum] : sums)
            for (std::size_t q = 0; q < m_quantities; ++q)
                if (sum.count[q] > 0)
                    traces[key.first].rows[q](static_cast<Eigen::Index>(key.second)) =
                        static_cast<float>(sum.sum[q] / sum.count[q]);
        for (auto& trace : traces)
            m_merge.take(std::move(trace));
    }

    /// Two rows of one time and place with different values.
    void settle(std::size_t bucket, const Spill& spill, const TallTrace& trace, const SpillRow& row,
                const float* values,
                std::map<std::pair<std::uint32_t, std::uint32_t>, Sums>& sums) const {
        if (m_job.record.duplicates == campaign::Duplicates::first)
            return;
        const TallFile& file = m_files[trace.file];
        if (m_job.record.duplicates == campaign::Duplicates::refuse) {
            std::size_t first_line = 0;
            spill.each(bucket, [&](const SpillRow& other, const float*) {
                if (other.trace != row.trace || other.place != row.place)
                    return true;
                first_line = other.line;
                return false;
            });
            refuse(file.head->file, row.line,
                   "a value of " + text::iso_time(trace.time_s) + " at " +
                       text::number(file.distance_m[row.place]) + " m stands here and in line " +
                       std::to_string(first_line) +
                       " with another value; take one out, or say record.duplicates = \"first\" "
                       "or \"mean\"");
        }
        Sums& sum = sums[{row.trace, row.place}];
        if (sum.sum.empty()) {
            std::vector<float> first;
            for (const auto& kept : trace.rows)
                first.push_back(kept(static_cast<Eigen::Index>(row.place)));
            sum.add(first);
        }
        sum.add({values, values + m_quantities});
    }

    const TextJob& m_job;
    const std::vector<TallFile>& m_files;
    TallMerge& m_merge;
    std::size_t m_quantities;
    std::vector<TraceKey> m_keys;
    std::vector<std::vector<std::uint32_t>> m_trace_of; ///< by file and place of its time
    std::size_t m_bucket_traces = 1;
    std::int64_t m_repeated = 0;
};

} // namespace

void gather_in_disorder(const TextJob& job, const std::vector<TallFile>& files, TallMerge& merge) {
    Sorter{job, files, merge}.run();
}

} // namespace rillstrand::record

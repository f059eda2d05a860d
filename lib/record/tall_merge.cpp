// SPDX-License-Identifier: Apache-2.0
#include "record/tall_merge.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::record {

namespace {

RecordHead head_of(const TextJob& job, const std::vector<TallFile>& files) {
    const TallFile& first = files.front();
    RecordHead head;
    head.distance_m = Eigen::Map<const Eigen::ArrayXd>(
        first.distance_m.data(), static_cast<Eigen::Index>(first.distance_m.size()));
    head.quantities.push_back(Quantity::temperature);
    for (const auto& [quantity, cell] : first.head->power_cells)
        head.quantities.push_back(quantity);
    for (const auto& file : files)
        head.traces += static_cast<std::int64_t>(file.times_s.size());
    head.interval_s = job.report.interval_s;
    return head;
}

bool same(float a, float b) {
    return a == b || (std::isnan(a) && std::isnan(b));
}

} // namespace

double GroupClock::time_s(const TallBlock& block, const TallGroup& group, std::size_t first_line) {
    if (!m_any || group.stamp != m_stamp) {
        m_stamp.assign(group.stamp);
        m_any = true;
        m_time_s = read_stamp(m_job.stamps, m_sequence, m_stamp, m_head.file,
                              first_line + block.line[group.first]);
    }
    return m_time_s;
}

TallMerge::TallMerge(const TextJob& job, const std::vector<TallFile>& files)
    : m_job{job}, m_files{files}, m_quantities{1 + files.front().head->power_cells.size()},
      m_rows{job.record, job.report, job.make_sink(head_of(job, files))} {
    for (const auto& file : files) {
        m_axes.emplace_back(Eigen::Map<const Eigen::ArrayXd>(
            file.distance_m.data(), static_cast<Eigen::Index>(file.distance_m.size())));
        m_same.push_back(m_axes.back().size() == m_axes.front().size() &&
                         (m_axes.back() - m_axes.front()).abs().maxCoeff() < 1e-6);
    }
}

TallTrace TallMerge::empty_trace(std::size_t file, double time_s, std::size_t line) const {
    const std::size_t n = m_files[file].distance_m.size();
    TallTrace trace;
    trace.file = file;
    trace.line = line;
    trace.time_s = time_s;
    trace.rows.assign(m_quantities,
                      Eigen::ArrayXf::Constant(static_cast<Eigen::Index>(n),
                                               std::numeric_limits<float>::quiet_NaN()));
    trace.present.assign(n, false);
    return trace;
}

bool TallMerge::joins(const TallTrace& trace) const {
    if (!m_held || m_held->time_s != trace.time_s || !m_same[m_held->file] || !m_same[trace.file])
        return false;
    bool adds = false;
    for (std::size_t j = 0; j < trace.present.size(); ++j) {
        if (!trace.present[j])
            continue;
        adds = adds || !m_held->present[j];
        if (!m_held->present[j])
            continue;
        const auto k = static_cast<Eigen::Index>(j);
        for (std::size_t q = 0; q < m_quantities; ++q)
            if (!same(trace.rows[q](k), m_held->rows[q](k)))
                return false;
    }
    return adds;
}

void TallMerge::take(TallTrace trace) {
    if (!joins(trace)) {
        hand_on();
        m_held = std::move(trace);
        return;
    }
    for (std::size_t j = 0; j < trace.present.size(); ++j)
        if (trace.present[j] && !m_held->present[j]) {
            m_held->present[j] = true;
            const auto k = static_cast<Eigen::Index>(j);
            for (std::size_t q = 0; q < m_quantities; ++q)
                m_held->rows[q](k) = trace.rows[q](k);
        }
}

void TallMerge::hand_on() {
    if (!m_held)
        return;
    if (!m_same[m_held->file])
        for (auto& row : m_held->rows)
            row = on_axis(m_axes[m_held->file], row, m_axes.front(), m_job.record.align);
    m_rows.take({m_held->time_s,
                 m_files[m_held->file].head->file.string() + ":" + std::to_string(m_held->line),
                 std::move(m_held->rows)});
    m_held.reset();
}

void TallMerge::finish() {
    hand_on();
    m_rows.finish();
}

} // namespace rillstrand::record

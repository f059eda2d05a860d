// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/row_order.hpp"
#include "record/tall_rows.hpp"

#include <optional>
#include <vector>

namespace rillstrand::record {

/// What a first look at one tall file told.
struct TallFile {
    const TextHead* head = nullptr;
    std::optional<ClockSequence> clock; ///< as it stood before the file's first stamp
    std::vector<double> times_s;        ///< increasing
    std::vector<double> distance_m;     ///< increasing
    bool in_order = true; ///< rows come trace by trace, in order of time, each place once
    std::size_t rows = 0;
};

/// One trace of one tall file while it is put together.
struct TallTrace {
    std::size_t file = 0;
    std::size_t line = 0; ///< of its first row
    double time_s = 0.0;
    std::vector<Eigen::ArrayXf> rows; ///< on the file's own distances; NaN where there is no row
    std::vector<bool> present;        ///< whether there is a row for a distance
};

/// Hands traces of tall files on. A trace whose rows are parted over files is put together, where
/// the parts do not contradict each other; others of one time go the way of all duplicates.
class TallMerge {
public:
    TallMerge(const TextJob& job, const std::vector<TallFile>& files);
    TallTrace empty_trace(std::size_t file, double time_s, std::size_t line) const;
    /// Traces in order of time.
    void take(TallTrace trace);
    void finish();
    std::size_t quantities() const { return m_quantities; }

private:
    bool joins(const TallTrace& trace) const;
    void hand_on();
    const TextJob& m_job;
    const std::vector<TallFile>& m_files;
    std::vector<Eigen::ArrayXd> m_axes;
    std::vector<bool> m_same; ///< file has the first file's distances
    std::size_t m_quantities;
    RowOrder m_rows;
    std::optional<TallTrace> m_held;
};

/// Reads a tall record whose rows come in any order: sorts them into traces by way of a scratch
/// file and hands the traces on.
void gather_in_disorder(const TextJob& job, const std::vector<TallFile>& files, TallMerge& merge);

/// Turns the stamps of groups into times; groups with one stamp follow each other often.
class GroupClock {
public:
    GroupClock(const TextJob& job, ClockSequence& sequence, const TextHead& head)
        : m_job{job}, m_sequence{sequence}, m_head{head} {}
    double time_s(const TallBlock& block, const TallGroup& group, std::size_t first_line);

private:
    const TextJob& m_job;
    ClockSequence& m_sequence;
    const TextHead& m_head;
    bool m_any = false;
    std::string m_stamp;
    double m_time_s = 0.0;
};

} // namespace rillstrand::record

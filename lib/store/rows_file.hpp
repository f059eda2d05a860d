// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "store/canonical.hpp"
#include "store/library.hpp"

#include <tbb/task_group.h>

#include <functional>
#include <limits>

/// The file under a CanonicalWriter in one packing; included by sources of this room only.
namespace rillstrand::store {

/// Name of a quantity's variable in the canonical record.
const char* variable_name(record::Quantity quantity);

/// Smallest and largest value so far.
struct Range {
    float low = std::numeric_limits<float>::infinity();
    float high = -std::numeric_limits<float>::infinity();
    void add(const float* values, Eigen::Index n);
    bool empty() const { return low > high; }
};

/// Collects rows into rows of chunks and writes each of these while the next one fills.
class RowsFile {
public:
    RowsFile(const std::filesystem::path& path, const CanonicalHead& head, Packing packing);
    RowsFile(const RowsFile&) = delete;
    RowsFile& operator=(const RowsFile&) = delete;
    RowsFile(RowsFile&&) = delete;
    RowsFile& operator=(RowsFile&&) = delete;
    ~RowsFile();

    Packing packing() const { return m_packing; }
    void moved_to(const std::filesystem::path& path) { m_file.moved_to(path); }
    /// @param rows  pointers to n_place values, one a quantity; each value returns from the packing
    void add_row(const std::vector<const float*>& rows);
    /// Hands every row taken so far to `take`, in order.
    void replay(const std::function<void(const std::vector<const float*>&)>& take);
    /// @param times_s  one for each row taken
    void finish(const std::vector<double>& times_s, const std::vector<Range>& ranges);

private:
    struct Rows {
        std::vector<std::vector<float>> values; ///< one a quantity, row after row
        Eigen::Index count = 0;
    };
    void make_axes();
    void make_quantity(std::size_t q);
    void begin_write();
    void write_rows(const Rows& rows, Eigen::Index first);
    void write_chunk(std::size_t q, const Rows& rows, Eigen::Index first,
                     Eigen::Index column) const;
    void write_times(const std::vector<double>& times_s);
    Packing packing_of(std::size_t q) const { return q == 0 ? m_packing : Packing::floating; }

    const CanonicalHead& m_head;
    Packing m_packing;
    Eigen::Index m_places;
    Eigen::Index m_chunk_rows;
    Eigen::Index m_chunk_columns;
    H5File m_file;
    std::vector<Handle> m_variables;
    Rows m_filling, m_writing;
    Eigen::Index m_written = 0; ///< rows handed to the writing task
    tbb::task_group m_task;
};

} // namespace rillstrand::store

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/source.hpp"

#include <Eigen/Core>

#include <filesystem>
#include <memory>
#include <string>
#include <vector>

namespace rillstrand::store {

/// How a quantity is stored. The packed forms are used only where every value provably returns.
enum class Packing {
    hundredths,  ///< int16, scale_factor 0.01: -327.67 to 327.67
    thousandths, ///< int32, scale_factor 0.001
    floating     ///< float32 as it is
};

/// What the writer must know before the first row.
struct CanonicalHead {
    Eigen::ArrayXd distance_m; ///< strictly increasing, no NaN
    std::vector<record::Quantity> quantities{record::Quantity::temperature}; ///< temperature first
    double interval_s = 0.0; ///< averaging interval: width of the time bounds
    std::string source;      ///< CF `source`: where the data come from, in words
    std::string history;     ///< CF `history`: a line with time, program and version
};

/// Writes the canonical record: NetCDF-4 by CF-1.11, temperature(time, distance), shuffle and
/// deflate 4, which every general tool reads without a plug-in.
///
/// Temperature is packed in the narrowest form of Packing in which every value returns: v equals
/// float(double(k) * scale) for its whole number k (NaN returns as NaN, -0 as 0). The form is told
/// from the first row of chunks and checked for every later value; when one does not fit, what was
/// written so far is written again in the wider form. Powers are float32. Chunks are
/// `chunk_rows` x 256 channels. Memory: two rows of chunks as floats, whatever the record's length.
///
/// The file comes to be at `path` (give a temporary name and rename it after `finish`); without
/// `finish` it is removed.
class CanonicalWriter final : public record::Sink {
public:
    /// @throws DataError if the distances do not increase; MachineError if the file cannot be made
    CanonicalWriter(std::filesystem::path path, CanonicalHead head);
    ~CanonicalWriter() override;

    /// @param time_s  UTC, middle of the interval, later than the row before
    /// @param rows    one array of n_place values a quantity, in the order of the head; NaN missing
    /// @throws MachineError if the file cannot be written
    void add_row(double time_s, const std::vector<Eigen::ArrayXf>& rows) override;

    /// Writes what is left, the axes and the ranges; closes the file and has it on the disk.
    /// @throws DataError if there is no row; MachineError if the file cannot be written
    void finish();

    Packing packing() const; ///< after finish
    Eigen::Index n_time() const;

private:
    class Data;
    std::unique_ptr<Data> m_data;
};

/// Rows of one chunk: the largest divisor of a day, in intervals, such that rows x all channels x
/// item size is at most 8 MiB. Tools that read a trace at a time keep one row of chunks in memory.
/// Where a day is not a whole number of intervals: the largest divisor of 288 that fits.
Eigen::Index chunk_rows(double interval_s, Eigen::Index n_place, std::size_t item_bytes);

} // namespace rillstrand::store

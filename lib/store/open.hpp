// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "campaign/campaign.hpp"
#include "record/cells.hpp"
#include "record/source.hpp"

#include <filesystem>
#include <memory>

namespace rillstrand::store {

/// Opens a canonical record (see CanonicalWriter). Its `read` may be called from several threads:
/// raw chunks are fetched one at a time and decoded outside the lock.
/// @throws DataError with the file and what is wrong
std::unique_ptr<record::Source> open_canonical(const std::filesystem::path& record_nc);

/// A grid as the campaign means it: degC, metres, distances increasing, what is missing or outside
/// the valid range NaN. Times are as stamped (UTC, neither shifted nor sorted).
struct GridHead {
    record::Axes axes; ///< interval_s is not set
    std::vector<record::Quantity> quantities;
    bool distance_reversed = false; ///< distances fall in the file
    Warnings warnings;
};

/// One NetCDF-3/4 or Zarr file of a record by the CF conventions.
///
/// Temperature is the variable that the campaign names, with a time and one other dimension in
/// either order. Chunked HDF5 with plain numbers (4- and 8-byte floats, 1- to 4-byte integers;
/// shuffle and deflate or no filter) is decoded here; anything else goes through GDAL's netCDF and
/// Zarr drivers and gives the same numbers.
class Grid {
public:
    /// @param general_path_only  never decode here (for tests)
    /// @throws DataError with the file, what is wrong and what mends it
    Grid(std::filesystem::path file, const campaign::Record& record,
         bool general_path_only = false);
    Grid(const Grid&) = delete;
    Grid& operator=(const Grid&) = delete;
    Grid(Grid&&) noexcept;
    Grid& operator=(Grid&&) noexcept;
    ~Grid();

    const std::filesystem::path& file() const;
    const GridHead& head() const;
    Eigen::Index block_rows() const;
    Eigen::Index block_columns() const;
    bool decoded_here() const; ///< the fast path is used for temperature
    /// As record::Source::read, and adds to `counts` what became of the values of temperature.
    void read(record::Quantity quantity, Eigen::Index i_time, Eigen::Index j_place,
              Eigen::Ref<Eigen::ArrayXXf> out, record::CellCounts& counts) const;

private:
    class Data;
    std::unique_ptr<Data> m_data;
};

/// One grid file as a record's source, for a look at it without gathering.
/// @throws DataError also where the times of the file do not increase
std::unique_ptr<record::Source> open_grid(const std::filesystem::path& file,
                                          const campaign::Record& record);

} // namespace rillstrand::store

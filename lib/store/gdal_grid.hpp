// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"
#include "store/tiles.hpp"

#include <gdal_priv.h>

#include <Eigen/Core>

#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <vector>

/// Variables of a NetCDF or Zarr file by GDAL; included by sources of this room only. The caller
/// holds the lock of the library.
namespace rillstrand::store {

using Array = std::shared_ptr<GDALMDArray>;

/// An opened file: its arrays by name.
class GdalGrid {
public:
    /// Opens with GDAL's netCDF and Zarr drivers and no others.
    /// @throws DataError if the path is no local file, or is cut short, or claims more than its
    /// bytes
    ///         can hold
    explicit GdalGrid(std::filesystem::path file);
    GdalGrid(const GdalGrid&) = delete;
    GdalGrid& operator=(const GdalGrid&) = delete;
    GdalGrid(GdalGrid&&) = delete;
    GdalGrid& operator=(GdalGrid&&) = delete;
    ~GdalGrid();

    const std::filesystem::path& file() const { return m_file; }
    std::vector<std::string> names() const;
    /// @return nullptr if there is none
    Array find(const std::string& name) const;
    /// @throws DataError with the file before what is wrong
    [[noreturn]] void refuse(const std::string& what) const;

    /// All of a one-dimensional variable.
    Eigen::ArrayXd read_all(const Array& array) const;

private:
    void open();
    void check_claims() const;
    std::filesystem::path m_file;
    std::unique_ptr<GDALDataset> m_dataset;
    std::shared_ptr<GDALGroup> m_root;
};

/// Text of an attribute, empty where there is none.
std::string text_of(const Array& array, const char* attribute);
/// The variable's unit, wherever the driver keeps it.
std::string unit_of(const Array& array);
bool is_numeric(const Array& array);

/// How the stored numbers of a variable are to be understood (CF 2.5.1, 8.1).
Decoding decoding_of(const Array& array);
/// Whether the only fill value is the zero that Zarr writes unless told otherwise.
bool zero_is_fill(const Array& array);

/// Blocks by GDAL: the general path. Keeps the file open.
std::unique_ptr<Tiles> open_general(std::shared_ptr<const GdalGrid> grid, Array array);

} // namespace rillstrand::store

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <hdf5.h>

#include <Eigen/Core>

#include <cstdint>
#include <filesystem>
#include <mutex>
#include <string>
#include <vector>

/// What the sources of this room share of HDF5; included by them only.
namespace rillstrand::store {

/// The lock that every call of HDF5 and of GDAL's netCDF and Zarr drivers needs. Debian builds HDF5
/// without thread safety, and our own calls, netCDF-C's and GDAL's end in one and the same copy of
/// it, with one global state: so there is one lock for the process and not one a file. It may be
/// taken again by who holds it.
std::recursive_mutex& library_mutex();

/// Takes the lock and keeps HDF5 from printing.
class LibraryLock {
public:
    LibraryLock();

private:
    std::lock_guard<std::recursive_mutex> m_lock;
};

/// The innermost reason of HDF5's last failure, or `HDF5 says nothing`.
std::string library_reason();

/// Owns one identifier of HDF5, whatever its kind.
class Handle {
public:
    using Close = herr_t (*)(hid_t);
    Handle() = default;
    Handle(hid_t id, Close close) : m_id{id}, m_close{close} {}
    Handle(const Handle&) = delete;
    Handle& operator=(const Handle&) = delete;
    Handle(Handle&& other) noexcept;
    Handle& operator=(Handle&& other) noexcept;
    ~Handle() { reset(); }
    hid_t get() const { return m_id; }
    explicit operator bool() const { return m_id >= 0; }
    /// @return false if closing failed
    bool reset();

private:
    hid_t m_id = -1;
    Close m_close = nullptr;
};

/// Opens an HDF5 file for reading, also while netCDF-C holds it open: HDF5 wants all who open one
/// file to ask for the same way of closing, and versions of netCDF-C ask for different ones.
/// @return an empty handle if it cannot be opened; the caller holds the lock
Handle open_for_reading(const std::filesystem::path& path);

/// Writes into one NetCDF-4 file by means of HDF5: dimensions, variables and attributes as netCDF-C
/// lays them out. Every call throws MachineError where HDF5 fails. The caller holds the lock.
class H5File {
public:
    static H5File create(const std::filesystem::path& path);
    static H5File reopen(const std::filesystem::path& path);

    hid_t id() const { return m_file.get(); }
    const std::filesystem::path& path() const { return m_path; }
    void moved_to(std::filesystem::path path) { m_path = std::move(path); }

    struct Extent {
        std::vector<hsize_t> now, chunk; ///< without chunk: contiguous and fixed
        bool grows = false;              ///< along the first dimension
        bool deflated = false;           ///< shuffle and deflate 4 are declared
    };
    /// @param fill  pointer to one value of `type`, or nullptr
    Handle make_variable(const std::string& name, hid_t type, const Extent& extent,
                         const void* fill) const;
    Handle variable(const std::string& name) const;
    bool has(const std::string& name) const;
    void remove(const std::string& name) const;
    /// Makes a variable the coordinate of a dimension of its own name.
    void make_dimension(hid_t variable, const std::string& name) const;
    /// A dimension without variable.
    void make_bare_dimension(const std::string& name, hsize_t size) const;
    void use_dimension(hid_t variable, const std::string& dimension, unsigned index) const;

    void put(hid_t object, const char* name, const std::string& text) const;
    void put(hid_t object, const char* name, double value) const;
    void put(hid_t object, const char* name, hid_t type, const void* values, hsize_t count) const;
    void put(hid_t object, const char* name, const std::vector<double>& values) const;
    std::string text(hid_t object, const char* name) const; ///< empty where there is none

    void write(hid_t variable, hid_t type, const void* values) const;
    Eigen::ArrayXd read_all(const std::string& name) const;

    /// Closes the file and has its bytes on the disk.
    void close();

    /// @throws MachineError with the path and HDF5's reason if `ok` is false
    void must(bool ok, const char* doing) const;

private:
    H5File(std::filesystem::path path, Handle file)
        : m_path{std::move(path)}, m_file{std::move(file)} {}
    std::filesystem::path m_path;
    Handle m_file;
};

} // namespace rillstrand::store

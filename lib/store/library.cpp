// SPDX-License-Identifier: Apache-2.0
#include "store/library.hpp"

#include "base/error.hpp"

#include <hdf5_hl.h>

#include <fcntl.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <utility>

namespace rillstrand::store {

std::recursive_mutex& library_mutex() {
    static std::recursive_mutex mutex;
    return mutex;
}

LibraryLock::LibraryLock() : m_lock{library_mutex()} {
    H5Eset_auto2(H5E_DEFAULT, nullptr, nullptr);
}

std::string library_reason() {
    std::string reason;
    const auto visit = [](unsigned, const H5E_error2_t* error, void* out) -> herr_t {
        auto& text = *static_cast<std::string*>(out);
        if (error->desc != nullptr && *error->desc != '\0')
            text = error->desc;
        return 0;
    };
    H5Ewalk2(H5E_DEFAULT, H5E_WALK_DOWNWARD, visit, &reason);
    // The text of the system stands inside, as `error message = 'No space left on device'`.
    const std::string key = "error message = '";
    if (const auto at = reason.find(key); at != std::string::npos) {
        const auto begin = at + key.size();
        reason = reason.substr(begin, reason.find('\'', begin) - begin);
    }
    return reason.empty() ? "HDF5 says nothing" : reason;
}

Handle::Handle(Handle&& other) noexcept
    : m_id{std::exchange(other.m_id, -1)}, m_close{other.m_close} {}

Handle& Handle::operator=(Handle&& other) noexcept {
    if (this != &other) {
        reset();
        m_id = std::exchange(other.m_id, -1);
        m_close = other.m_close;
    }
    return *this;
}

bool Handle::reset() {
    if (m_id < 0)
        return true;
    const LibraryLock lock;
    return m_close(std::exchange(m_id, -1)) >= 0;
}

Handle open_for_reading(const std::filesystem::path& path) {
    for (const H5F_close_degree_t degree : {H5F_CLOSE_SEMI, H5F_CLOSE_STRONG, H5F_CLOSE_WEAK}) {
        const Handle access{H5Pcreate(H5P_FILE_ACCESS), H5Pclose};
        H5Pset_fclose_degree(access.get(), degree);
        Handle file{H5Fopen(path.c_str(), H5F_ACC_RDONLY, access.get()), H5Fclose};
        if (file || library_reason().find("close degree") == std::string::npos)
            return file;
    }
    return {};
}

void H5File::must(bool ok, const char* doing) const {
    if (!ok)
        throw MachineError{m_path.string() + ": cannot be written (" + doing + ": " +
                           library_reason() + "); see to the folder, its space and its rights"};
}

H5File H5File::create(const std::filesystem::path& path) {
    // netCDF-C gives the order of creation to dimensions and variables, and asks for it when
    // the file is opened for changes.
    const Handle created{H5Pcreate(H5P_FILE_CREATE), H5Pclose};
    H5Pset_link_creation_order(created.get(), H5P_CRT_ORDER_TRACKED | H5P_CRT_ORDER_INDEXED);
    const Handle access{H5Pcreate(H5P_FILE_ACCESS), H5Pclose};
    H5Pset_fclose_degree(access.get(), H5F_CLOSE_STRONG);
    H5File file{path,
                {H5Fcreate(path.c_str(), H5F_ACC_TRUNC, created.get(), access.get()), H5Fclose}};
    file.must(static_cast<bool>(file.m_file), "making the file");
    return file;
}

H5File H5File::reopen(const std::filesystem::path& path) {
    const Handle access{H5Pcreate(H5P_FILE_ACCESS), H5Pclose};
    H5Pset_fclose_degree(access.get(), H5F_CLOSE_STRONG);
    H5File file{path, {H5Fopen(path.c_str(), H5F_ACC_RDWR, access.get()), H5Fclose}};
    file.must(static_cast<bool>(file.m_file), "opening the file");
    return file;
}

Handle H5File::make_variable(const std::string& name, hid_t type, const Extent& extent,
                             const void* fill) const {
    const auto rank = static_cast<int>(extent.now.size());
    std::vector<hsize_t> most = extent.now;
    if (extent.grows)
        most.front() = H5S_UNLIMITED;
    const Handle space{rank == 0 ? H5Screate(H5S_SCALAR)
                                 : H5Screate_simple(rank, extent.now.data(), most.data()),
                       H5Sclose};
    const Handle form{H5Pcreate(H5P_DATASET_CREATE), H5Pclose};
    H5Pset_attr_creation_order(form.get(), H5P_CRT_ORDER_TRACKED | H5P_CRT_ORDER_INDEXED);
    H5Pset_obj_track_times(form.get(), false); // the same record gives the same bytes
    if (!extent.chunk.empty())
        H5Pset_chunk(form.get(), rank, extent.chunk.data());
    if (fill != nullptr)
        H5Pset_fill_value(form.get(), type, fill);
    if (extent.deflated) {
        H5Pset_shuffle(form.get());
        H5Pset_deflate(form.get(), 4);
    }
    Handle made{
        H5Dcreate2(id(), name.c_str(), type, space.get(), H5P_DEFAULT, form.get(), H5P_DEFAULT),
        H5Dclose};
    must(static_cast<bool>(made), "making a variable");
    return made;
}

Handle H5File::variable(const std::string& name) const {
    Handle found{H5Dopen2(id(), name.c_str(), H5P_DEFAULT), H5Dclose};
    must(static_cast<bool>(found), "finding a variable");
    return found;
}

bool H5File::has(const std::string& name) const {
    return H5Lexists(id(), name.c_str(), H5P_DEFAULT) > 0;
}

void H5File::remove(const std::string& name) const {
    must(H5Ldelete(id(), name.c_str(), H5P_DEFAULT) >= 0, "taking out a variable");
}

void H5File::make_dimension(hid_t variable, const std::string& name) const {
    must(H5DSset_scale(variable, name.c_str()) >= 0, "making a dimension");
}

void H5File::make_bare_dimension(const std::string& name, hsize_t size) const {
    const Handle made = make_variable(name, H5T_IEEE_F32BE, {{size}, {}, false, false}, nullptr);
    // The words by which netCDF-C tells a dimension without variable, with the size in ten places.
    std::string digits = std::to_string(size);
    digits.insert(0, 10 - std::min<std::size_t>(10, digits.size()), ' ');
    make_dimension(made.get(), "This is a netCDF dimension but not a netCDF variable." + digits);
}

void H5File::use_dimension(hid_t variable, const std::string& dimension, unsigned index) const {
    const Handle scale = this->variable(dimension);
    must(H5DSattach_scale(variable, scale.get(), index) >= 0, "joining a dimension");
}

void H5File::put(hid_t object, const char* name, const std::string& text) const {
    const Handle type{H5Tcopy(H5T_C_S1), H5Tclose};
    H5Tset_size(type.get(), std::max<std::size_t>(1, text.size()));
    H5Tset_strpad(type.get(), H5T_STR_NULLTERM);
    const bool plain = std::all_of(text.begin(), text.end(),
                                   [](char c) { return static_cast<unsigned char>(c) < 128; });
    H5Tset_cset(type.get(), plain ? H5T_CSET_ASCII : H5T_CSET_UTF8);
    if (H5Aexists(object, name) > 0)
        H5Adelete(object, name);
    const Handle space{H5Screate(H5S_SCALAR), H5Sclose};
    const Handle made{H5Acreate2(object, name, type.get(), space.get(), H5P_DEFAULT, H5P_DEFAULT),
                      H5Aclose};
    must(static_cast<bool>(made) && H5Awrite(made.get(), type.get(), text.c_str()) >= 0,
         "writing an attribute");
}

void H5File::put(hid_t object, const char* name, hid_t type, const void* values,
                 hsize_t count) const {
    if (H5Aexists(object, name) > 0)
        H5Adelete(object, name);
    const Handle space{H5Screate_simple(1, &count, nullptr), H5Sclose};
    const Handle made{H5Acreate2(object, name, type, space.get(), H5P_DEFAULT, H5P_DEFAULT),
                      H5Aclose};
    must(static_cast<bool>(made) && H5Awrite(made.get(), type, values) >= 0,
         "writing an attribute");
}

void H5File::put(hid_t object, const char* name, double value) const {
    put(object, name, H5T_NATIVE_DOUBLE, &value, 1);
}

void H5File::put(hid_t object, const char* name, const std::vector<double>& values) const {
    put(object, name, H5T_NATIVE_DOUBLE, values.data(), values.size());
}

std::string H5File::text(hid_t object, const char* name) const {
    if (H5Aexists(object, name) <= 0)
        return {};
    const Handle found{H5Aopen(object, name, H5P_DEFAULT), H5Aclose};
    const Handle type{H5Aget_type(found.get()), H5Tclose};
    if (H5Tget_class(type.get()) != H5T_STRING || H5Tis_variable_str(type.get()) > 0)
        return {};
    std::string text(H5Tget_size(type.get()), '\0');
    must(H5Aread(found.get(), type.get(), text.data()) >= 0, "reading an attribute");
    return text.substr(0, text.find('\0'));
}

void H5File::write(hid_t variable, hid_t type, const void* values) const {
    must(H5Dwrite(variable, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, values) >= 0,
         "writing a variable");
}

Eigen::ArrayXd H5File::read_all(const std::string& name) const {
    const Handle found = variable(name);
    const Handle space{H5Dget_space(found.get()), H5Sclose};
    Eigen::ArrayXd values(static_cast<Eigen::Index>(H5Sget_simple_extent_npoints(space.get())));
    must(H5Dread(found.get(), H5T_NATIVE_DOUBLE, H5S_ALL, H5S_ALL, H5P_DEFAULT, values.data()) >= 0,
         "reading a variable");
    return values;
}

void H5File::close() {
    if (!m_file)
        return;
    must(H5Fflush(id(), H5F_SCOPE_GLOBAL) >= 0, "flushing the file");
    must(m_file.reset(), "closing the file");
    const int file = ::open(m_path.c_str(), O_RDWR | O_CLOEXEC);
    const bool on_disk = file >= 0 && ::fsync(file) == 0;
    const int reason = errno;
    if (file >= 0)
        ::close(file);
    if (!on_disk)
        throw MachineError{m_path.string() +
                           ": cannot be brought to the disk: " + std::strerror(reason)};
}

} // namespace rillstrand::store

// SPDX-License-Identifier: Apache-2.0
#include "store/chunk_codec.hpp"
#include "store/library.hpp"
#include "store/open.hpp"
#include "store/rows_file.hpp"
#include "store/tiles.hpp"

#include <algorithm>
#include <array>
#include <utility>
#include <vector>

namespace rillstrand::store {

namespace {

using record::Quantity;

constexpr std::array all_quantities{Quantity::temperature, Quantity::stokes, Quantity::antistokes,
                                    Quantity::reverse_stokes, Quantity::reverse_antistokes};

/// A file that CanonicalWriter wrote: by HDF5 alone, so that GDAL need not be loaded.
class CanonicalSource final : public record::Source {
public:
    explicit CanonicalSource(std::filesystem::path path) : m_path{std::move(path)} {
        std::error_code ignored;
        if (!std::filesystem::exists(m_path, ignored))
            refuse("there is no such file; gather the record first");
        if (!is_hdf5(m_path))
            refuse("is no NetCDF-4 file");
        const LibraryLock lock;
        const Handle file = open_for_reading(m_path);
        if (!file)
            refuse("cannot be opened (" + library_reason() + ")");
        m_axes.time_s = read_all(file.get(), "time");
        m_axes.distance_m = read_all(file.get(), "distance");
        const Eigen::ArrayXd bounds = read_all(file.get(), "time_bnds");
        if (bounds.size() != 2 * m_axes.n_time() || m_axes.n_time() == 0)
            refuse("has no trace, or its time bounds do not go with its times");
        m_axes.interval_s = bounds(1) - bounds(0);
        for (const Quantity quantity : all_quantities)
            if (H5Lexists(file.get(), variable_name(quantity), H5P_DEFAULT) > 0)
                add(file.get(), quantity);
        if (m_stored.empty() || m_stored.front().quantity != Quantity::temperature)
            refuse("has no variable \"temperature\"");
    }

    const record::Axes& axes() const override { return m_axes; }
    bool has(Quantity quantity) const override { return find(quantity) != m_stored.end(); }
    Eigen::Index block_rows() const override { return block(0); }
    Eigen::Index block_columns() const override { return block(1); }
    void read(Quantity quantity, Eigen::Index i_time, Eigen::Index j_place,
              Eigen::Ref<Eigen::ArrayXXf> out) const override {
        const auto found = find(quantity);
        if (found == m_stored.end())
            refuse("holds no such power");
        const auto n = [](Eigen::Index i) { return static_cast<std::size_t>(i); };
        found->tiles->read({n(i_time), n(j_place), n(out.rows()), n(out.cols())}, found->decoding,
                           Target<float>{out.data(), 1, out.outerStride()});
    }

private:
    struct Stored {
        Quantity quantity = Quantity::temperature;
        Decoding decoding;
        std::unique_ptr<Tiles> tiles;
    };

    [[noreturn]] void refuse(const std::string& what) const {
        throw DataError{m_path.string() + ": " + what};
    }

    std::vector<Stored>::const_iterator find(Quantity quantity) const {
        return std::find_if(m_stored.begin(), m_stored.end(),
                            [quantity](const auto& s) { return s.quantity == quantity; });
    }

    Eigen::Index block(std::size_t k) const {
        return static_cast<Eigen::Index>(m_stored.front().tiles->block_size()[k]);
    }

    Eigen::ArrayXd read_all(hid_t file, const char* name) const {
        const Handle variable{H5Dopen2(file, name, H5P_DEFAULT), H5Dclose};
        if (!variable)
            refuse(std::string{"has no variable \""} + name + "\"");
        const Handle space{H5Dget_space(variable.get()), H5Sclose};
        Eigen::ArrayXd values(static_cast<Eigen::Index>(H5Sget_simple_extent_npoints(space.get())));
        if (H5Dread(variable.get(), H5T_NATIVE_DOUBLE, H5S_ALL, H5S_ALL, H5P_DEFAULT,
                    values.data()) < 0)
            refuse(std::string{"the variable \""} + name + "\" cannot be read (" +
                   library_reason() + ")");
        return values;
    }

    void add(hid_t file, Quantity quantity) {
        const char* name = variable_name(quantity);
        Stored stored{quantity, {}, open_chunks(m_path, name)};
        const Handle variable{H5Dopen2(file, name, H5P_DEFAULT), H5Dclose};
        const Handle space{H5Dget_space(variable.get()), H5Sclose};
        std::array<hsize_t, 2> size{};
        if (!stored.tiles || H5Sget_simple_extent_ndims(space.get()) != 2 ||
            H5Sget_simple_extent_dims(space.get(), size.data(), nullptr) < 0 ||
            size[0] != static_cast<hsize_t>(m_axes.n_time()) ||
            size[1] != static_cast<hsize_t>(m_axes.n_place()))
            refuse(std::string{"the variable \""} + name +
                   "\" is not laid out as this program "
                   "writes it");
        const Handle type{H5Dget_type(variable.get()), H5Tclose};
        if (H5Tget_class(type.get()) == H5T_FLOAT)
            stored.decoding.fills[0] = static_cast<double>(fill_float32);
        else
            stored.decoding.fills[0] = H5Tget_size(type.get()) == 2 ? fill_int16 : fill_int32;
        if (H5Aexists(variable.get(), "scale_factor") > 0) {
            const Handle scale{H5Aopen(variable.get(), "scale_factor", H5P_DEFAULT), H5Aclose};
            H5Aread(scale.get(), H5T_NATIVE_DOUBLE, &stored.decoding.scale);
        }
        m_stored.push_back(std::move(stored));
    }

    std::filesystem::path m_path;
    record::Axes m_axes;
    std::vector<Stored> m_stored;
};

} // namespace

std::unique_ptr<record::Source> open_canonical(const std::filesystem::path& record_nc) {
    return std::make_unique<CanonicalSource>(record_nc);
}

} // namespace rillstrand::store

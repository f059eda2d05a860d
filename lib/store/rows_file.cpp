// SPDX-License-Identifier: Apache-2.0
#include "store/rows_file.hpp"

#include "base/text.hpp"
#include "store/chunk_codec.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <exception>
#include <numeric>
#include <utility>

namespace rillstrand::store {

namespace {

constexpr Eigen::Index channels_of_chunk = 256;

hid_t stored_type(Packing packing) {
    switch (packing) {
    case Packing::hundredths:
        return H5T_STD_I16LE;
    case Packing::thousandths:
        return H5T_STD_I32LE;
    case Packing::floating:
        break;
    }
    return H5T_IEEE_F32LE;
}

const void* fill_of(Packing packing) {
    switch (packing) {
    case Packing::hundredths:
        return &fill_int16;
    case Packing::thousandths:
        return &fill_int32;
    case Packing::floating:
        break;
    }
    return &fill_float32;
}

const char* long_name(record::Quantity quantity) {
    switch (quantity) {
    case record::Quantity::temperature:
        return "temperature along the fibre";
    case record::Quantity::stokes:
        return "Stokes power";
    case record::Quantity::antistokes:
        return "anti-Stokes power";
    case record::Quantity::reverse_stokes:
        return "Stokes power from the far end";
    case record::Quantity::reverse_antistokes:
        return "anti-Stokes power from the far end";
    }
    return "";
}

/// Half way to the neighbours; the ends reach as far outward as inward.
std::vector<double> distance_bounds(const Eigen::ArrayXd& distance_m) {
    const Eigen::Index n = distance_m.size();
    std::vector<double> bounds;
    for (Eigen::Index j = 0; j < n; ++j) {
        const double before = j > 0   ? distance_m(j) - distance_m(j - 1)
                              : n > 1 ? distance_m(1) - distance_m(0)
                                      : 0.0;
        const double after = j + 1 < n ? distance_m(j + 1) - distance_m(j) : before;
        bounds.push_back(distance_m(j) - 0.5 * before);
        bounds.push_back(distance_m(j) + 0.5 * after);
    }
    return bounds;
}

} // namespace

const char* variable_name(record::Quantity quantity) {
    switch (quantity) {
    case record::Quantity::temperature:
        return "temperature";
    case record::Quantity::stokes:
        return "stokes";
    case record::Quantity::antistokes:
        return "antistokes";
    case record::Quantity::reverse_stokes:
        return "reverse_stokes";
    case record::Quantity::reverse_antistokes:
        return "reverse_antistokes";
    }
    return "";
}

void Range::add(const float* values, Eigen::Index n) {
    float least = low, most = high;
    for (Eigen::Index j = 0; j < n; ++j) { // comparisons with NaN are false
        least = values[j] < least ? values[j] : least;
        most = values[j] > most ? values[j] : most;
    }
    low = least;
    high = most;
}

Eigen::Index chunk_rows(double interval_s, Eigen::Index n_place, std::size_t item_bytes) {
    constexpr std::int64_t most_bytes = 8 << 20;
    constexpr double day_s = 86400.0;
    std::int64_t day = 288;
    if (interval_s >= 1.0 && interval_s <= day_s) {
        const double rows = day_s / interval_s;
        if (std::abs(rows - std::round(rows)) < 1e-6)
            day = std::llround(rows);
    }
    const std::int64_t row_bytes =
        std::max<std::int64_t>(1, n_place) * static_cast<std::int64_t>(item_bytes);
    const std::int64_t most = std::max<std::int64_t>(1, most_bytes / row_bytes);
    for (std::int64_t rows = std::min(day, most); rows > 1; --rows)
        if (day % rows == 0)
            return static_cast<Eigen::Index>(rows);
    return 1;
}

RowsFile::RowsFile(const std::filesystem::path& path, const CanonicalHead& head, Packing packing)
    : m_head{head}, m_packing{packing}, m_places{head.distance_m.size()},
      m_chunk_rows{chunk_rows(head.interval_s, m_places, item_bytes(packing))},
      m_chunk_columns{std::min(m_places, channels_of_chunk)}, m_file{H5File::create(path)} {
    const LibraryLock lock;
    const hid_t root = m_file.id();
    m_file.put(root, "Conventions", std::string{"CF-1.11"});
    m_file.put(root, "featureType", std::string{"timeSeries"});
    m_file.put(root, "title", std::string{"Temperature along a fibre-optic cable"});
    if (!head.source.empty())
        m_file.put(root, "source", head.source);
    if (!head.history.empty())
        m_file.put(root, "history", head.history);
    make_axes();
    for (std::size_t q = 0; q < head.quantities.size(); ++q)
        make_quantity(q);
    const auto size = static_cast<std::size_t>(m_chunk_rows * m_places);
    m_filling.values.assign(head.quantities.size(), std::vector<float>(size));
    m_writing.values.assign(head.quantities.size(), std::vector<float>(size));
}

RowsFile::~RowsFile() {
    try {
        m_task.cancel();
        m_task.wait();
    } catch (...) { // the reason was told where it arose, or the record is given up
    }
    const LibraryLock lock;
    m_variables.clear();
}

void RowsFile::make_axes() {
    const auto places = static_cast<hsize_t>(m_places);
    const Handle time =
        m_file.make_variable("time", H5T_IEEE_F64LE, {{0}, {4096}, true, false}, nullptr);
    m_file.make_dimension(time.get(), "time");
    m_file.put(time.get(), "standard_name", std::string{"time"});
    m_file.put(time.get(), "long_name", std::string{"middle of the averaging interval"});
    m_file.put(time.get(), "units", std::string{"seconds since 1970-01-01T00:00:00Z"});
    m_file.put(time.get(), "calendar", std::string{"standard"});
    m_file.put(time.get(), "axis", std::string{"T"});
    m_file.put(time.get(), "bounds", std::string{"time_bnds"});
    const Handle distance =
        m_file.make_variable("distance", H5T_IEEE_F64LE, {{places}, {}, false, false}, nullptr);
    m_file.make_dimension(distance.get(), "distance");
    m_file.put(distance.get(), "long_name", std::string{"fibre distance from the instrument"});
    m_file.put(distance.get(), "units", std::string{"m"});
    m_file.put(distance.get(), "bounds", std::string{"distance_bnds"});
    m_file.write(distance.get(), H5T_NATIVE_DOUBLE, m_head.distance_m.data());
    m_file.put(distance.get(), "actual_range",
               std::vector<double>{m_head.distance_m(0), m_head.distance_m(m_places - 1)});
    m_file.make_bare_dimension("nv", 2);
    const Handle time_bounds = m_file.make_variable("time_bnds", H5T_IEEE_F64LE,
                                                    {{0, 2}, {4096, 2}, true, false}, nullptr);
    m_file.use_dimension(time_bounds.get(), "time", 0);
    m_file.use_dimension(time_bounds.get(), "nv", 1);
    const Handle bounds = m_file.make_variable("distance_bnds", H5T_IEEE_F64LE,
                                               {{places, 2}, {}, false, false}, nullptr);
    m_file.use_dimension(bounds.get(), "distance", 0);
    m_file.use_dimension(bounds.get(), "nv", 1);
    m_file.write(bounds.get(), H5T_NATIVE_DOUBLE, distance_bounds(m_head.distance_m).data());
    const Handle channel =
        m_file.make_variable("channel", H5T_STD_I32LE, {{places}, {}, false, false}, nullptr);
    m_file.use_dimension(channel.get(), "distance", 0);
    m_file.put(channel.get(), "long_name", std::string{"number of the channel, from 0"});
    m_file.put(channel.get(), "cf_role", std::string{"timeseries_id"});
    std::vector<std::int32_t> numbers(static_cast<std::size_t>(m_places));
    std::iota(numbers.begin(), numbers.end(), 0);
    m_file.write(channel.get(), H5T_NATIVE_INT32, numbers.data());
}

void RowsFile::make_quantity(std::size_t q) {
    const record::Quantity quantity = m_head.quantities[q];
    const Packing packing = packing_of(q);
    const auto places = static_cast<hsize_t>(m_places);
    Handle made = m_file.make_variable(
        variable_name(quantity), stored_type(packing),
        {{0, places},
         {static_cast<hsize_t>(m_chunk_rows), static_cast<hsize_t>(m_chunk_columns)},
         true,
         true},
        fill_of(packing));
    const hid_t id = made.get();
    m_file.use_dimension(id, "time", 0);
    m_file.use_dimension(id, "distance", 1);
    m_file.put(id, "_FillValue", stored_type(packing), fill_of(packing), 1);
    m_file.put(id, "long_name", std::string{long_name(quantity)});
    if (quantity == record::Quantity::temperature) {
        m_file.put(id, "units", std::string{"degC"});
        m_file.put(id, "units_metadata", std::string{"temperature: on_scale"});
    } else {
        m_file.put(id, "units", std::string{"1"});
        m_file.put(id, "comment", std::string{"in the unit of the instrument"});
    }
    if (packing != Packing::floating)
        m_file.put(id, "scale_factor", scale_of(packing));
    m_file.put(id, "cell_methods", std::string{"time: mean"});
    m_file.put(id, "coordinates", std::string{"channel"});
    m_variables.push_back(std::move(made));
}

void RowsFile::add_row(const std::vector<const float*>& rows) {
    for (std::size_t q = 0; q < rows.size(); ++q)
        std::copy_n(rows[q], m_places, m_filling.values[q].begin() + m_filling.count * m_places);
    if (++m_filling.count == m_chunk_rows)
        begin_write();
}

void RowsFile::begin_write() {
    m_task.wait(); // and throws what the task before threw
    std::swap(m_filling, m_writing);
    m_filling.count = 0;
    const Eigen::Index first = m_written;
    m_written += m_writing.count;
    m_task.run([this, first] { write_rows(m_writing, first); });
}

void RowsFile::write_rows(const Rows& rows, Eigen::Index first) {
    {
        const LibraryLock lock;
        const std::array<hsize_t, 2> size{static_cast<hsize_t>(first + rows.count),
                                          static_cast<hsize_t>(m_places)};
        for (const Handle& variable : m_variables)
            m_file.must(H5Dset_extent(variable.get(), size.data()) >= 0, "making room");
    }
    const Eigen::Index columns = (m_places + m_chunk_columns - 1) / m_chunk_columns;
    const auto quantities = static_cast<Eigen::Index>(m_variables.size());
    tbb::parallel_for(Eigen::Index{0}, columns * quantities, [&](Eigen::Index task) {
        write_chunk(static_cast<std::size_t>(task / columns), rows, first,
                    (task % columns) * m_chunk_columns);
    });
}

void RowsFile::write_chunk(std::size_t q, const Rows& rows, Eigen::Index first,
                           Eigen::Index column) const {
    const Packing packing = packing_of(q);
    const std::size_t item = item_bytes(packing);
    const auto width = static_cast<std::size_t>(m_chunk_columns);
    const auto used = static_cast<std::size_t>(std::min(m_chunk_columns, m_places - column));
    std::vector<std::uint8_t> plain(static_cast<std::size_t>(m_chunk_rows) * width * item);
    std::vector<float> row(width, std::numeric_limits<float>::quiet_NaN());
    for (Eigen::Index i = 0; i < m_chunk_rows; ++i) {
        if (i < rows.count)
            std::copy_n(rows.values[q].begin() + i * m_places + column, used, row.begin());
        else if (i == rows.count)
            std::fill(row.begin(), row.end(), std::numeric_limits<float>::quiet_NaN());
        pack_values(packing, row, plain.data() + static_cast<std::size_t>(i) * width * item);
    }
    std::vector<std::uint8_t> shuffled(plain.size());
    shuffle(plain, item, shuffled);
    const std::vector<std::uint8_t> packed = thread_deflater().pack(shuffled);
    const std::array<hsize_t, 2> offset{static_cast<hsize_t>(first), static_cast<hsize_t>(column)};
    const LibraryLock lock;
    m_file.must(H5Dwrite_chunk(m_variables[q].get(), H5P_DEFAULT, 0, offset.data(), packed.size(),
                               packed.data()) >= 0,
                "writing a chunk");
}

void RowsFile::replay(const std::function<void(const std::vector<const float*>&)>& take) {
    m_task.wait();
    Rows block;
    block.values.assign(m_variables.size(), m_writing.values.front());
    std::vector<std::int32_t> items(block.values.front().size());
    std::vector<const float*> row(m_variables.size());
    const auto hand_on = [&](const Rows& rows) {
        for (Eigen::Index i = 0; i < rows.count; ++i) {
            for (std::size_t q = 0; q < row.size(); ++q)
                row[q] = rows.values[q].data() + i * m_places;
            take(row);
        }
    };
    for (Eigen::Index first = 0; first < m_written; first += m_chunk_rows) {
        block.count = std::min(m_chunk_rows, m_written - first);
        const std::array<hsize_t, 2> begin{static_cast<hsize_t>(first), 0};
        const std::array<hsize_t, 2> count{static_cast<hsize_t>(block.count),
                                           static_cast<hsize_t>(m_places)};
        for (std::size_t q = 0; q < m_variables.size(); ++q) {
            const bool packed = packing_of(q) != Packing::floating;
            void* out = packed ? static_cast<void*>(items.data()) : block.values[q].data();
            {
                const LibraryLock lock;
                const Handle space{H5Dget_space(m_variables[q].get()), H5Sclose};
                const Handle memory{H5Screate_simple(2, count.data(), nullptr), H5Sclose};
                H5Sselect_hyperslab(space.get(), H5S_SELECT_SET, begin.data(), nullptr,
                                    count.data(), nullptr);
                m_file.must(H5Dread(m_variables[q].get(),
                                    packed ? H5T_NATIVE_INT32 : H5T_NATIVE_FLOAT, memory.get(),
                                    space.get(), H5P_DEFAULT, out) >= 0,
                            "reading back");
            }
            const std::int32_t fill = m_packing == Packing::hundredths ? fill_int16 : fill_int32;
            const double scale = scale_of(packing_of(q));
            for (std::size_t k = 0; k < items.size(); ++k) {
                float& value = block.values[q][k];
                if (packed)
                    value = items[k] == fill ? std::numeric_limits<float>::quiet_NaN()
                                             : static_cast<float>(items[k] * scale);
                else if (value == fill_float32)
                    value = std::numeric_limits<float>::quiet_NaN();
            }
        }
        hand_on(block);
    }
    hand_on(m_filling);
}

void RowsFile::write_times(const std::vector<double>& times_s) {
    const std::array<hsize_t, 2> size{times_s.size(), 2};
    std::vector<double> bounds;
    bounds.reserve(2 * times_s.size());
    for (const double t : times_s) {
        bounds.push_back(t - 0.5 * m_head.interval_s);
        bounds.push_back(t + 0.5 * m_head.interval_s);
    }
    const Handle time = m_file.variable("time");
    m_file.must(H5Dset_extent(time.get(), size.data()) >= 0, "making room");
    m_file.write(time.get(), H5T_NATIVE_DOUBLE, times_s.data());
    m_file.put(time.get(), "actual_range", std::vector<double>{times_s.front(), times_s.back()});
    const Handle time_bounds = m_file.variable("time_bnds");
    m_file.must(H5Dset_extent(time_bounds.get(), size.data()) >= 0, "making room");
    m_file.write(time_bounds.get(), H5T_NATIVE_DOUBLE, bounds.data());
}

void RowsFile::finish(const std::vector<double>& times_s, const std::vector<Range>& ranges) {
    if (m_filling.count > 0)
        begin_write();
    m_task.wait();
    const LibraryLock lock;
    write_times(times_s);
    for (std::size_t q = 0; q < m_variables.size(); ++q) {
        if (ranges[q].empty())
            continue;
        const hid_t id = m_variables[q].get();
        if (packing_of(q) == Packing::floating) {
            const std::array<float, 2> range{ranges[q].low, ranges[q].high};
            m_file.put(id, "actual_range", H5T_NATIVE_FLOAT, range.data(), 2);
            continue;
        }
        // Of the unpacked data, in the type of scale_factor (CF 2.5.1).
        const double scale = scale_of(m_packing);
        const auto unpacked = [scale](float v) {
            return std::nearbyint(static_cast<double>(v) / scale) * scale;
        };
        m_file.put(id, "actual_range",
                   std::vector<double>{unpacked(ranges[q].low), unpacked(ranges[q].high)});
    }
    m_variables.clear();
    m_file.close();
}

} // namespace rillstrand::store

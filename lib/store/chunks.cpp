// SPDX-License-Identifier: Apache-2.0
#include "base/error.hpp"
#include "store/chunk_codec.hpp"
#include "store/library.hpp"
#include "store/tiles.hpp"

#include <algorithm>
#include <cstring>
#include <fstream>
#include <optional>
#include <type_traits>
#include <vector>

namespace rillstrand::store {

namespace {

enum class Stored { i8, u8, i16, u16, i32, u32, f32, f64 };

std::optional<Stored> stored_kind(hid_t type) {
    const std::array<std::pair<hid_t, Stored>, 8> known{{{H5T_NATIVE_INT8, Stored::i8},
                                                         {H5T_NATIVE_UINT8, Stored::u8},
                                                         {H5T_NATIVE_INT16, Stored::i16},
                                                         {H5T_NATIVE_UINT16, Stored::u16},
                                                         {H5T_NATIVE_INT32, Stored::i32},
                                                         {H5T_NATIVE_UINT32, Stored::u32},
                                                         {H5T_NATIVE_FLOAT, Stored::f32},
                                                         {H5T_NATIVE_DOUBLE, Stored::f64}}};
    for (const auto& [id, kind] : known)
        if (H5Tequal(type, id) > 0)
            return kind;
    return {};
}

/// Calls `use` with a null pointer of the stored type.
template <typename Use> void with_type(Stored kind, Use use) {
    switch (kind) {
    case Stored::i8:
        use(static_cast<const std::int8_t*>(nullptr));
        break;
    case Stored::u8:
        use(static_cast<const std::uint8_t*>(nullptr));
        break;
    case Stored::i16:
        use(static_cast<const std::int16_t*>(nullptr));
        break;
    case Stored::u16:
        use(static_cast<const std::uint16_t*>(nullptr));
        break;
    case Stored::i32:
        use(static_cast<const std::int32_t*>(nullptr));
        break;
    case Stored::u32:
        use(static_cast<const std::uint32_t*>(nullptr));
        break;
    case Stored::f32:
        use(static_cast<const float*>(nullptr));
        break;
    case Stored::f64:
        use(static_cast<const double*>(nullptr));
        break;
    }
}

/// Buffers of one thread, kept between chunks.
struct Scratch {
    std::vector<std::uint8_t> packed, shuffled, plain;
    std::vector<float> floats;
    std::vector<double> doubles;
    template <typename Value> Value* values(std::size_t n) {
        if constexpr (std::is_same_v<Value, float>) {
            floats.resize(n);
            return floats.data();
        } else {
            doubles.resize(n);
            return doubles.data();
        }
    }
};

Scratch& scratch() {
    static thread_local Scratch mine;
    return mine;
}

/// Which of the filters of a variable are which; nothing if there is another one.
struct Filters {
    int shuffle = -1, deflate = -1; ///< places in the pipeline
};

std::optional<Filters> filters_of(hid_t form) {
    Filters filters;
    const int n = H5Pget_nfilters(form);
    for (int k = 0; k < n; ++k) {
        unsigned flags = 0;
        std::size_t values = 0;
        const H5Z_filter_t filter = H5Pget_filter2(form, static_cast<unsigned>(k), &flags, &values,
                                                   nullptr, 0, nullptr, nullptr);
        if (filter == H5Z_FILTER_SHUFFLE && filters.shuffle < 0 && filters.deflate < 0)
            filters.shuffle = k;
        else if (filter == H5Z_FILTER_DEFLATE && filters.deflate < 0)
            filters.deflate = k;
        else
            return {};
    }
    return filters;
}

class Chunks final : public Tiles {
public:
    static std::unique_ptr<Tiles> open(const std::filesystem::path& file,
                                       const std::string& variable) {
        auto made = std::unique_ptr<Chunks>(new Chunks{file});
        return made->prepare(variable) ? std::move(made) : nullptr;
    }

    std::array<std::size_t, 2> block_size() const override { return {m_chunk[0], m_chunk[1]}; }
    void read(const Block& block, const Decoding& decoding, Target<float> to) const override {
        read_chunks(block, decoding, to);
    }
    void read(const Block& block, const Decoding& decoding, Target<double> to) const override {
        read_chunks(block, decoding, to);
    }

private:
    explicit Chunks(std::filesystem::path path) : m_path{std::move(path)} {}

    bool prepare(const std::string& variable) {
        const LibraryLock lock;
        m_file = open_for_reading(m_path);
        if (!m_file)
            return false;
        m_variable = {H5Dopen2(m_file.get(), variable.c_str(), H5P_DEFAULT), H5Dclose};
        if (!m_variable)
            return false;
        const Handle type{H5Dget_type(m_variable.get()), H5Tclose};
        const Handle form{H5Dget_create_plist(m_variable.get()), H5Pclose};
        const Handle space{H5Dget_space(m_variable.get()), H5Sclose};
        const auto kind = stored_kind(type.get());
        if (!kind || H5Pget_layout(form.get()) != H5D_CHUNKED ||
            H5Sget_simple_extent_ndims(space.get()) != 2)
            return false;
        m_kind = *kind;
        m_item = H5Tget_size(type.get());
        std::array<hsize_t, 2> chunk{};
        H5Pget_chunk(form.get(), 2, chunk.data());
        m_chunk = {static_cast<std::size_t>(chunk[0]), static_cast<std::size_t>(chunk[1])};
        const auto filters = filters_of(form.get());
        constexpr std::size_t largest_chunk = 256U << 20U;
        if (!filters || chunk_bytes() > largest_chunk)
            return false;
        m_filters = *filters;
        m_unwritten.resize(m_item);
        return H5Pget_fill_value(form.get(), type.get(), m_unwritten.data()) >= 0;
    }

    std::size_t chunk_bytes() const { return m_chunk[0] * m_chunk[1] * m_item; }

    [[noreturn]] void refuse(const std::array<hsize_t, 2>& offset, const std::string& what) const {
        throw DataError{m_path.string() + ": the block that begins at row " +
                        std::to_string(offset[0]) + ", column " + std::to_string(offset[1]) + " " +
                        what + "; copy the file again from where it came from"};
    }

    /// The bytes of a chunk as they were before the filters.
    const std::uint8_t* chunk(const std::array<hsize_t, 2>& offset, Scratch& mine) const {
        std::uint32_t skipped = 0;
        const std::size_t bytes = chunk_bytes();
        {
            const LibraryLock lock;
            hsize_t size = 0;
            if (H5Dget_chunk_storage_size(m_variable.get(), offset.data(), &size) < 0)
                size = 0;
            if (size > 2 * bytes + 65536)
                refuse(offset, "is larger than its numbers");
            mine.packed.resize(static_cast<std::size_t>(size));
            if (size > 0 && H5Dread_chunk(m_variable.get(), H5P_DEFAULT, offset.data(), &skipped,
                                          mine.packed.data()) < 0)
                refuse(offset, "cannot be read (" + library_reason() + ")");
        }
        if (mine.packed.empty())
            return unwritten(mine);
        const std::uint8_t* now = mine.packed.data();
        std::size_t size = mine.packed.size();
        const auto used = [&](int place) {
            return place >= 0 && (skipped & (1U << static_cast<unsigned>(place))) == 0;
        };
        if (used(m_filters.deflate)) {
            mine.shuffled.resize(bytes);
            if (!thread_deflater().unpack({now, size}, mine.shuffled))
                refuse(offset, "is broken (it does not unpack)");
            now = mine.shuffled.data();
            size = bytes;
        }
        if (size != bytes)
            refuse(offset, "is of the wrong size");
        if (used(m_filters.shuffle) && m_item > 1) {
            mine.plain.resize(bytes);
            unshuffle({now, bytes}, m_item, mine.plain);
            now = mine.plain.data();
        }
        return now;
    }

    const std::uint8_t* unwritten(Scratch& mine) const {
        mine.plain.resize(chunk_bytes());
        for (std::size_t k = 0; k < mine.plain.size(); k += m_item)
            std::copy(m_unwritten.begin(), m_unwritten.end(),
                      mine.plain.begin() + static_cast<std::ptrdiff_t>(k));
        return mine.plain.data();
    }

    template <typename Value>
    void read_chunks(const Block& block, const Decoding& decoding, Target<Value> to) const {
        if (block.n_a == 0 || block.n_b == 0)
            return;
        Scratch& mine = scratch();
        auto* values = mine.values<Value>(m_chunk[0] * m_chunk[1]);
        for (std::size_t ca = block.a / m_chunk[0]; ca * m_chunk[0] < block.a + block.n_a; ++ca)
            for (std::size_t cb = block.b / m_chunk[1]; cb * m_chunk[1] < block.b + block.n_b;
                 ++cb) {
                const std::size_t a0 = ca * m_chunk[0], b0 = cb * m_chunk[1];
                const std::uint8_t* bytes = chunk({a0, b0}, mine);
                const std::size_t a = std::max(a0, block.a), b = std::max(b0, block.b);
                const std::size_t n_a = std::min(a0 + m_chunk[0], block.a + block.n_a) - a;
                const std::size_t n_b = std::min(b0 + m_chunk[1], block.b + block.n_b) - b;
                const std::size_t first = (a - a0) * m_chunk[1];
                with_type(m_kind, [&](auto type) {
                    using Item = std::remove_cvref_t<decltype(*type)>;
                    decoding(reinterpret_cast<const Item*>(bytes) + first, n_a * m_chunk[1],
                             values);
                });
                const auto step = [](std::size_t n) { return static_cast<std::ptrdiff_t>(n); };
                scatter<Value>(
                    values + (b - b0), m_chunk[1], n_a, n_b,
                    {to.data + step(a - block.a) * to.step_a + step(b - block.b) * to.step_b,
                     to.step_a, to.step_b});
            }
    }

    std::filesystem::path m_path;
    Handle m_file, m_variable;
    Stored m_kind = Stored::f32;
    std::size_t m_item = 4;
    std::array<std::size_t, 2> m_chunk{};
    Filters m_filters;
    std::vector<std::uint8_t> m_unwritten; ///< one fill value
};

} // namespace

std::unique_ptr<Tiles> open_chunks(const std::filesystem::path& file, const std::string& variable) {
    if (!is_hdf5(file))
        return nullptr;
    return Chunks::open(file, variable);
}

bool is_hdf5(const std::filesystem::path& file) {
    constexpr std::array<char, 8> signature{'\x89', 'H', 'D', 'F', '\r', '\n', '\x1a', '\n'};
    std::array<char, 8> head{};
    std::ifstream in{file, std::ios::binary};
    return in.read(head.data(), head.size()) && head == signature;
}

void refuse_other_files(const std::filesystem::path& file) {
    const LibraryLock lock;
    const Handle opened = open_for_reading(file);
    if (!opened)
        throw DataError{file.string() + ": begins as a NetCDF-4 file but cannot be opened (" +
                        library_reason() + "); it is cut short or broken, copy it again"};
    std::string found;
    const auto visit = [](hid_t group, const char* name, const H5L_info_t* info,
                          void* out) -> herr_t {
        auto& culprit = *static_cast<std::string*>(out);
        if (info->type == H5L_TYPE_EXTERNAL)
            culprit = name;
        if (info->type != H5L_TYPE_HARD || !culprit.empty())
            return culprit.empty() ? 0 : 1;
        const Handle object{H5Oopen(group, name, H5P_DEFAULT), H5Oclose};
        if (!object || H5Iget_type(object.get()) != H5I_DATASET)
            return 0;
        const Handle form{H5Dget_create_plist(object.get()), H5Pclose};
        if (H5Pget_external_count(form.get()) > 0 || H5Pget_layout(form.get()) == H5D_VIRTUAL)
            culprit = name;
        return culprit.empty() ? 0 : 1;
    };
    H5Lvisit(opened.get(), H5_INDEX_NAME, H5_ITER_NATIVE, visit, &found);
    if (!found.empty())
        throw DataError{file.string() + ": \"" + found +
                        "\" takes its numbers from another file; give a file that holds its own"};
}

} // namespace rillstrand::store

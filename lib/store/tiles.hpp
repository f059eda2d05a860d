// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <filesystem>
#include <limits>
#include <memory>
#include <string>

/// Blocks of a two-dimensional variable as numbers; included by sources of this room only.
namespace rillstrand::store {

/// What a stored number means: NaN if it equals a fill value or lies outside [low, high], else
/// number * scale + offset.
struct Decoding {
    double scale = 1.0;
    double offset = 0.0;
    std::array<double, 3> fills{std::numeric_limits<double>::quiet_NaN(),
                                std::numeric_limits<double>::quiet_NaN(),
                                std::numeric_limits<double>::quiet_NaN()}; ///< NaN: none
    double low = -std::numeric_limits<double>::infinity();                 ///< as stored
    double high = std::numeric_limits<double>::infinity();

    template <typename Stored, typename Value>
    void operator()(const Stored* stored, std::size_t n, Value* values) const {
        const Decoding d = *this;
        for (std::size_t i = 0; i < n; ++i) {
            const auto x = static_cast<double>(stored[i]);
            const bool missing = (x == d.fills[0]) | (x == d.fills[1]) | (x == d.fills[2]) |
                                 (x < d.low) | (x > d.high);
            const auto value = static_cast<Value>(x * d.scale + d.offset);
            values[i] = missing ? std::numeric_limits<Value>::quiet_NaN() : value;
        }
    }
};

/// Where a block goes: element (a, b) of the two stored dimensions to data[a * step_a + b *
/// step_b].
template <typename Value> struct Target {
    Value* data = nullptr;
    std::ptrdiff_t step_a = 0, step_b = 0;
};

/// Copies rows of `width` values, one after the other, into a target: in small squares, so that a
/// transposed target is written a cache line at a time.
template <typename Value>
void scatter(const Value* rows, std::size_t width, std::size_t n_a, std::size_t n_b,
             Target<Value> to) {
    constexpr std::size_t side = 16;
    for (std::size_t a0 = 0; a0 < n_a; a0 += side)
        for (std::size_t b0 = 0; b0 < n_b; b0 += side) {
            const std::size_t a1 = a0 + side < n_a ? a0 + side : n_a;
            const std::size_t b1 = b0 + side < n_b ? b0 + side : n_b;
            for (std::size_t b = b0; b < b1; ++b) {
                Value* out = to.data + static_cast<std::ptrdiff_t>(b) * to.step_b;
                for (std::size_t a = a0; a < a1; ++a)
                    out[static_cast<std::ptrdiff_t>(a) * to.step_a] = rows[a * width + b];
            }
        }
}

/// A block of the two stored dimensions.
struct Block {
    std::size_t a = 0, b = 0, n_a = 0, n_b = 0;
};

/// Reads blocks of one variable; may be called from several threads at once.
class Tiles {
public:
    Tiles() = default;
    Tiles(const Tiles&) = delete;
    Tiles& operator=(const Tiles&) = delete;
    Tiles(Tiles&&) = delete;
    Tiles& operator=(Tiles&&) = delete;
    virtual ~Tiles() = default;
    /// Size of the blocks that are cheapest to read.
    virtual std::array<std::size_t, 2> block_size() const = 0;
    /// @throws DataError naming the file and the block if it cannot be read
    virtual void read(const Block& block, const Decoding& decoding, Target<float> to) const = 0;
    virtual void read(const Block& block, const Decoding& decoding, Target<double> to) const = 0;
};

/// Raw chunks of an HDF5 file, fetched one at a time under the lock and decoded outside it.
/// @return nullptr if the file or the variable is not of the kinds that are decoded here: chunks of
///         native 1- to 4-byte integers or 4- and 8-byte floats with shuffle and deflate, or
///         either, or neither
std::unique_ptr<Tiles> open_chunks(const std::filesystem::path& file, const std::string& variable);

/// Whether a file begins as HDF5 files do.
bool is_hdf5(const std::filesystem::path& file);

/// @throws DataError if an HDF5 file cannot be opened, or takes its numbers from other files
///         (external links, external storage, virtual datasets)
void refuse_other_files(const std::filesystem::path& file);

} // namespace rillstrand::store

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "store/canonical.hpp"

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

/// Bytes of a chunk to and from numbers; included by sources of this room only.
namespace rillstrand::store {

/// HDF5's shuffle: the first bytes of all items, then the second ones, and so on. Bytes beyond the
/// last whole item stay at the end.
void shuffle(std::span<const std::uint8_t> plain, std::size_t item_bytes,
             std::span<std::uint8_t> shuffled);
void unshuffle(std::span<const std::uint8_t> shuffled, std::size_t item_bytes,
               std::span<std::uint8_t> plain);

/// zlib's stream by libdeflate, level 4; one object a thread.
class Deflater {
public:
    Deflater();
    Deflater(const Deflater&) = delete;
    Deflater& operator=(const Deflater&) = delete;
    Deflater(Deflater&&) = delete;
    Deflater& operator=(Deflater&&) = delete;
    ~Deflater();
    std::vector<std::uint8_t> pack(std::span<const std::uint8_t> plain);
    /// @return false if the stream is broken or does not give exactly `plain.size()` bytes
    bool unpack(std::span<const std::uint8_t> packed, std::span<std::uint8_t> plain);

private:
    void* m_compressor = nullptr;
    void* m_decompressor = nullptr;
};
/// The calling thread's own.
Deflater& thread_deflater();

std::size_t item_bytes(Packing packing);
double scale_of(Packing packing); ///< 1 for floating

constexpr std::int16_t fill_int16 = -32768;
constexpr std::int32_t fill_int32 = -2147483647 - 1;
constexpr float fill_float32 = 9.9692099683868690e36F; ///< netCDF's own fill of floats

/// Whether each value returns from a packing: NaN, or v == float(double(k) * scale) for a whole k.
bool returns(Packing packing, std::span<const float> values);
/// The narrowest packing in which each value returns.
Packing narrowest(std::span<const float> values);

/// Values as items of a packing, written one after the other into `items` (of item_bytes each).
void pack_values(Packing packing, std::span<const float> values, std::uint8_t* items);

} // namespace rillstrand::store

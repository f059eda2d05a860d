// SPDX-License-Identifier: Apache-2.0
#include "store/chunk_codec.hpp"

#include <libdeflate.h>

#include <algorithm>
#include <cmath>
#include <cstring>
#include <new>

namespace rillstrand::store {

namespace {

template <std::size_t Bytes>
void shuffle_items(const std::uint8_t* plain, std::size_t n, std::uint8_t* shuffled) {
    for (std::size_t b = 0; b < Bytes; ++b)
        for (std::size_t i = 0; i < n; ++i)
            shuffled[b * n + i] = plain[i * Bytes + b];
}

template <std::size_t Bytes>
void unshuffle_items(const std::uint8_t* __restrict shuffled, std::size_t n,
                     std::uint8_t* __restrict plain) {
    for (std::size_t i = 0; i < n; ++i)
        for (std::size_t b = 0; b < Bytes; ++b)
            plain[i * Bytes + b] = shuffled[b * n + i];
}

/// Two and four bytes an item as whole numbers: plain loops that the compiler turns into vectors.
void unshuffle_2(const std::uint8_t* __restrict low, std::size_t n,
                 std::uint8_t* __restrict plain) {
    const std::uint8_t* __restrict high = low + n;
    for (std::size_t i = 0; i < n; ++i) {
        plain[2 * i] = low[i];
        plain[2 * i + 1] = high[i];
    }
}

void unshuffle_4(const std::uint8_t* __restrict b0, std::size_t n, std::uint8_t* __restrict plain) {
    const std::uint8_t* __restrict b1 = b0 + n;
    const std::uint8_t* __restrict b2 = b1 + n;
    const std::uint8_t* __restrict b3 = b2 + n;
    for (std::size_t i = 0; i < n; ++i) {
        const std::uint32_t item =
            static_cast<std::uint32_t>(b0[i]) | static_cast<std::uint32_t>(b1[i]) << 8U |
            static_cast<std::uint32_t>(b2[i]) << 16U | static_cast<std::uint32_t>(b3[i]) << 24U;
        std::memcpy(plain + 4 * i, &item, 4);
    }
}

/// The nearest whole number, ties to even, of a number below 2^51: an addition and a subtraction,
/// which become vectors where std::nearbyint is a call.
inline double whole(double x) {
    constexpr double shift = 6755399441055744.0; // 1.5 * 2^52
    return (x + shift) - shift;
}

bool returns_as(double scale, double most, std::span<const float> values) {
    const double per_unit = 1.0 / scale;
    bool all = true;
    for (const float v : values) {
        const double x = static_cast<double>(v) * per_unit;
        const double k = whole(x);
        const bool back = (std::abs(k) <= most) & (static_cast<float>(k * scale) == v);
        all &= back | (v != v); // NaN: missing
    }
    return all;
}

template <typename Item>
void pack_as(double scale, Item fill, std::span<const float> values, std::uint8_t* items) {
    const double per_unit = 1.0 / scale;
    for (std::size_t i = 0; i < values.size(); ++i) {
        const float v = values[i];
        const Item item =
            v != v ? fill : static_cast<Item>(whole(static_cast<double>(v) * per_unit));
        std::memcpy(items + i * sizeof(Item), &item, sizeof(Item));
    }
}

constexpr double most_int16 = 32767.0;
constexpr double most_int32 = 2147483647.0;

} // namespace

void shuffle(std::span<const std::uint8_t> plain, std::size_t item_bytes,
             std::span<std::uint8_t> shuffled) {
    const std::size_t n = plain.size() / item_bytes;
    switch (item_bytes) {
    case 2:
        shuffle_items<2>(plain.data(), n, shuffled.data());
        break;
    case 4:
        shuffle_items<4>(plain.data(), n, shuffled.data());
        break;
    case 8:
        shuffle_items<8>(plain.data(), n, shuffled.data());
        break;
    default:
        shuffle_items<1>(plain.data(), n, shuffled.data());
        break;
    }
    std::copy(plain.begin() + static_cast<std::ptrdiff_t>(n * item_bytes), plain.end(),
              shuffled.begin() + static_cast<std::ptrdiff_t>(n * item_bytes));
}

void unshuffle(std::span<const std::uint8_t> shuffled, std::size_t item_bytes,
               std::span<std::uint8_t> plain) {
    const std::size_t n = shuffled.size() / item_bytes;
    switch (item_bytes) {
    case 2:
        unshuffle_2(shuffled.data(), n, plain.data());
        break;
    case 4:
        unshuffle_4(shuffled.data(), n, plain.data());
        break;
    case 8:
        unshuffle_items<8>(shuffled.data(), n, plain.data());
        break;
    default:
        unshuffle_items<1>(shuffled.data(), n, plain.data());
        break;
    }
    std::copy(shuffled.begin() + static_cast<std::ptrdiff_t>(n * item_bytes), shuffled.end(),
              plain.begin() + static_cast<std::ptrdiff_t>(n * item_bytes));
}

Deflater::Deflater()
    : m_compressor{libdeflate_alloc_compressor(4)}, m_decompressor{
                                                        libdeflate_alloc_decompressor()} {
    if (m_compressor == nullptr || m_decompressor == nullptr)
        throw std::bad_alloc{};
}

Deflater::~Deflater() {
    libdeflate_free_compressor(static_cast<libdeflate_compressor*>(m_compressor));
    libdeflate_free_decompressor(static_cast<libdeflate_decompressor*>(m_decompressor));
}

std::vector<std::uint8_t> Deflater::pack(std::span<const std::uint8_t> plain) {
    auto* compressor = static_cast<libdeflate_compressor*>(m_compressor);
    std::vector<std::uint8_t> packed(libdeflate_zlib_compress_bound(compressor, plain.size()));
    packed.resize(libdeflate_zlib_compress(compressor, plain.data(), plain.size(), packed.data(),
                                           packed.size()));
    return packed;
}

bool Deflater::unpack(std::span<const std::uint8_t> packed, std::span<std::uint8_t> plain) {
    return libdeflate_zlib_decompress(static_cast<libdeflate_decompressor*>(m_decompressor),
                                      packed.data(), packed.size(), plain.data(), plain.size(),
                                      nullptr) == LIBDEFLATE_SUCCESS;
}

Deflater& thread_deflater() {
    static thread_local Deflater deflater;
    return deflater;
}

std::size_t item_bytes(Packing packing) {
    return packing == Packing::hundredths ? 2 : 4;
}

double scale_of(Packing packing) {
    switch (packing) {
    case Packing::hundredths:
        return 0.01;
    case Packing::thousandths:
        return 0.001;
    case Packing::floating:
        break;
    }
    return 1.0;
}

bool returns(Packing packing, std::span<const float> values) {
    switch (packing) {
    case Packing::hundredths:
        return returns_as(0.01, most_int16, values);
    case Packing::thousandths:
        return returns_as(0.001, most_int32, values);
    case Packing::floating:
        break;
    }
    return true;
}

Packing narrowest(std::span<const float> values) {
    if (returns(Packing::hundredths, values))
        return Packing::hundredths;
    if (returns(Packing::thousandths, values))
        return Packing::thousandths;
    return Packing::floating;
}

void pack_values(Packing packing, std::span<const float> values, std::uint8_t* items) {
    switch (packing) {
    case Packing::hundredths:
        pack_as<std::int16_t>(0.01, fill_int16, values, items);
        return;
    case Packing::thousandths:
        pack_as<std::int32_t>(0.001, fill_int32, values, items);
        return;
    case Packing::floating:
        break;
    }
    for (std::size_t i = 0; i < values.size(); ++i) {
        const float item = values[i] != values[i] ? fill_float32 : values[i];
        std::memcpy(items + i * sizeof(float), &item, sizeof(float));
    }
}

} // namespace rillstrand::store

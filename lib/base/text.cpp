// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <chrono>
#include <cmath>
#include <cstdio>

namespace rillstrand::text {

std::string number(double value) {
    if (std::isnan(value))
        return "nan";
    if (value == 0.0)
        return "0";
    std::array<char, 32> buffer{};
    const auto result = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value);
    return {buffer.data(), result.ptr};
}

std::string fixed(double value, int decimals) {
    if (std::isnan(value))
        return "nan";
    std::array<char, 400> buffer{};
    const auto result = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value,
                                      std::chars_format::fixed, decimals);
    std::string text{buffer.data(), result.ptr};
    if (text.front() == '-' && text.find_first_of("123456789") == std::string::npos &&
        std::isfinite(value))
        text.erase(0, 1);
    return text;
}

std::optional<double> parse_number(std::string_view text) {
    while (!text.empty() && (text.front() == ' ' || text.front() == '\t'))
        text.remove_prefix(1);
    while (!text.empty() && (text.back() == ' ' || text.back() == '\t'))
        text.remove_suffix(1);
    if (text.size() > 1 && text.front() == '+' && text[1] != '-' && text[1] != '+')
        text.remove_prefix(1);
    double value = 0.0;
    const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
    if (error != std::errc{} || end != text.data() + text.size() || !std::isfinite(value))
        return std::nullopt;
    return value;
}

std::string iso_time(double unix_s) {
    if (!std::isfinite(unix_s))
        return {};
    const double rounded_ms = std::round(unix_s * 1e3);
    const std::chrono::milliseconds since{static_cast<long long>(rounded_ms)};
    const auto days = std::chrono::floor<std::chrono::days>(since);
    const std::chrono::year_month_day date{std::chrono::sys_days{days}};
    const std::chrono::hh_mm_ss clock{since - days};
    std::array<char, 64> buffer{};
    std::snprintf(buffer.data(), buffer.size(), "%04d-%02u-%02uT%02d:%02d:%02d",
                  static_cast<int>(date.year()), static_cast<unsigned>(date.month()),
                  static_cast<unsigned>(date.day()), static_cast<int>(clock.hours().count()),
                  static_cast<int>(clock.minutes().count()),
                  static_cast<int>(clock.seconds().count()));
    std::string text{buffer.data()};
    if (clock.subseconds().count() != 0) {
        std::snprintf(buffer.data(), buffer.size(), ".%03d",
                      static_cast<int>(clock.subseconds().count()));
        text += buffer.data();
    }
    return text + "Z";
}

std::string slug(std::string_view name) {
    std::string result;
    bool gap = false;
    for (char c : name) {
        if (c >= 'A' && c <= 'Z')
            c = static_cast<char>(c - 'A' + 'a');
        if ((c >= 'a' && c <= 'z') || (c >= '0' && c <= '9')) {
            result += c;
            gap = false;
        } else if (!gap) {
            result += '_';
            gap = true;
        }
    }
    return result;
}

std::size_t edit_distance(std::string_view a, std::string_view b) {
    std::vector<std::vector<std::size_t>> d(a.size() + 1, std::vector<std::size_t>(b.size() + 1));
    for (std::size_t i = 0; i <= a.size(); ++i)
        d[i][0] = i;
    for (std::size_t j = 0; j <= b.size(); ++j)
        d[0][j] = j;
    for (std::size_t i = 1; i <= a.size(); ++i) {
        for (std::size_t j = 1; j <= b.size(); ++j) {
            const std::size_t replaced = d[i - 1][j - 1] + (a[i - 1] == b[j - 1] ? 0U : 1U);
            d[i][j] = std::min({d[i - 1][j] + 1, d[i][j - 1] + 1, replaced});
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                d[i][j] = std::min(d[i][j], d[i - 2][j - 2] + 1);
        }
    }
    return d[a.size()][b.size()];
}

std::string nearest(std::string_view word, const std::vector<std::string>& candidates) {
    if (word.size() > 200)
        return {};
    std::string best;
    std::size_t best_distance = std::max<std::size_t>(2, word.size() / 2) + 1;
    for (const auto& candidate : candidates) {
        const std::size_t distance = edit_distance(word, candidate);
        if (distance < best_distance) {
            best = candidate;
            best_distance = distance;
        }
    }
    return best;
}

} // namespace rillstrand::text

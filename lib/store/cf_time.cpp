// SPDX-License-Identifier: Apache-2.0
#include "store/cf_time.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <chrono>
#include <cmath>
#include <optional>
#include <utility>

namespace rillstrand::store {

namespace {

constexpr std::string_view since = " since ";

std::string lower(std::string_view text) {
    std::string result{text};
    std::transform(result.begin(), result.end(), result.begin(), [](char c) {
        return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
    });
    return result;
}

std::string_view trimmed(std::string_view text) {
    const auto begin = text.find_first_not_of(" \t");
    if (begin == std::string_view::npos)
        return {};
    return text.substr(begin, text.find_last_not_of(" \t") - begin + 1);
}

std::optional<double> unit_seconds(std::string_view unit) {
    static constexpr std::array<std::pair<std::string_view, double>, 27> known{
        {{"nanoseconds", 1e-9},  {"nanosecond", 1e-9},
         {"ns", 1e-9},           {"microseconds", 1e-6},
         {"microsecond", 1e-6},  {"us", 1e-6},
         {"milliseconds", 1e-3}, {"millisecond", 1e-3},
         {"msec", 1e-3},         {"msecs", 1e-3},
         {"ms", 1e-3},           {"seconds", 1.0},
         {"second", 1.0},        {"secs", 1.0},
         {"sec", 1.0},           {"s", 1.0},
         {"minutes", 60.0},      {"minute", 60.0},
         {"mins", 60.0},         {"min", 60.0},
         {"hours", 3600.0},      {"hour", 3600.0},
         {"hrs", 3600.0},        {"hr", 3600.0},
         {"h", 3600.0},          {"days", 86400.0},
         {"day", 86400.0}}};
    for (const auto& [name, seconds] : known)
        if (unit == name)
            return seconds;
    if (unit == "d")
        return 86400.0;
    if (unit == "weeks" || unit == "week")
        return 604800.0;
    return {};
}

/// Reads one piece after another of a date.
class Pieces {
public:
    explicit Pieces(std::string_view text) : m_rest{text} {}
    bool done() const { return m_rest.empty(); }
    bool take(char c) {
        if (m_rest.empty() || m_rest.front() != c)
            return false;
        m_rest.remove_prefix(1);
        return true;
    }
    void skip_blanks() {
        while (take(' ')) {
        }
    }
    std::optional<int> whole(std::size_t most_digits) {
        std::size_t n = 0;
        while (n < m_rest.size() && n < most_digits && m_rest[n] >= '0' && m_rest[n] <= '9')
            ++n;
        int value = 0;
        if (n == 0)
            return {};
        std::from_chars(m_rest.data(), m_rest.data() + n, value);
        m_rest.remove_prefix(n);
        return value;
    }
    std::optional<double> real() {
        const auto n = std::min(m_rest.find_first_not_of("0123456789."), m_rest.size());
        const auto value = text::parse_number(m_rest.substr(0, n));
        m_rest.remove_prefix(n);
        return value;
    }
    std::string_view rest() const { return m_rest; }

private:
    std::string_view m_rest;
};

/// Offset of a zone: `Z`, `UTC`, `+02:00`, `-0330`, `+2`; nothing if it is none of these.
std::optional<double> zone_offset_s(std::string_view zone) {
    const std::string name = lower(zone);
    if (name == "z" || name == "utc" || name == "gmt")
        return 0.0;
    Pieces pieces{zone};
    const double sign = pieces.take('-') ? -1.0 : 1.0;
    if (sign > 0.0)
        pieces.take('+');
    const auto hours = pieces.whole(2);
    if (!hours)
        return {};
    pieces.take(':');
    const auto minutes = pieces.whole(2);
    if (!pieces.done() || *hours > 14 || minutes.value_or(0) > 59)
        return {};
    return sign * (*hours * 3600.0 + minutes.value_or(0) * 60.0);
}

struct Date {
    double utc_s = 0.0;
    bool zone_said = false;
};

std::optional<Date> read_date(std::string_view text) {
    Pieces pieces{text};
    const auto year = pieces.whole(4);
    if (!year || !pieces.take('-'))
        return {};
    const auto month = pieces.whole(2);
    if (!month || !pieces.take('-'))
        return {};
    const auto day = pieces.whole(2);
    if (!day)
        return {};
    const std::chrono::year_month_day date{std::chrono::year{*year},
                                           std::chrono::month{static_cast<unsigned>(*month)},
                                           std::chrono::day{static_cast<unsigned>(*day)}};
    if (!date.ok())
        return {};
    Date result;
    result.utc_s =
        static_cast<double>(std::chrono::sys_days{date}.time_since_epoch().count()) * 86400.0;
    if (!pieces.take('T'))
        pieces.skip_blanks();
    if (const auto hour = pieces.whole(2)) {
        int minute = 0;
        double second = 0.0;
        if (pieces.take(':'))
            minute = pieces.whole(2).value_or(99);
        if (pieces.take(':'))
            second = pieces.real().value_or(99.0);
        if (*hour > 24 || minute > 59 || second >= 61.0)
            return {};
        result.utc_s += *hour * 3600.0 + minute * 60.0 + second;
    }
    pieces.skip_blanks();
    if (pieces.done())
        return result;
    const auto offset_s = zone_offset_s(pieces.rest());
    if (!offset_s)
        return {};
    result.utc_s -= *offset_s;
    result.zone_said = true;
    return result;
}

} // namespace

double TimeUnits::to_utc_s(double value) const {
    const double utc_s = epoch_s + value * unit_s;
    const double whole_ms = std::round(utc_s * 1e3) / 1e3;
    return std::abs(utc_s - whole_ms) < 5e-5 ? whole_ms : utc_s;
}

bool looks_like_time_units(std::string_view units) {
    return lower(units).find(since) != std::string::npos;
}

TimeUnits read_time_units(std::string_view units, std::string_view calendar) {
    const std::string words = lower(calendar);
    const bool mixed = words.empty() || words == "standard" || words == "gregorian";
    if (!mixed && words != "proleptic_gregorian")
        throw DataError{"the calendar of time is \"" + std::string{calendar} +
                        "\", which no clock in the field keeps; write the times in the standard "
                        "calendar"};
    const auto at = lower(units).find(since);
    const std::string wrong = "the units of time are \"" + std::string{units} + "\"; ";
    if (at == std::string::npos)
        throw DataError{wrong + "write them as \"seconds since 1970-01-01T00:00:00Z\""};
    const auto unit_s = unit_seconds(lower(trimmed(units.substr(0, at))));
    if (!unit_s)
        throw DataError{wrong + "a length of time of fixed seconds is needed (weeks, days, hours, "
                                "minutes, seconds or parts of a second)"};
    const auto date = read_date(trimmed(units.substr(at + since.size())));
    if (!date)
        throw DataError{wrong + "the date is none that can be read; write it as "
                                "1970-01-01T00:00:00Z"};
    constexpr double reform_s = -12219292800.0; // 1582-10-15
    if (mixed && date->utc_s < reform_s)
        throw DataError{wrong +
                        "the standard calendar changes its rule on 1582-10-15; count from a "
                        "later date or say calendar = \"proleptic_gregorian\""};
    return {date->utc_s, *unit_s, date->zone_said};
}

} // namespace rillstrand::store

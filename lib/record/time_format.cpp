// SPDX-License-Identifier: Apache-2.0
#include "record/time_format.hpp"

#include "base/error.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <chrono>
#include <cmath>

namespace rillstrand::record {

namespace {

constexpr double day_s = 86400.0;
constexpr std::array<std::string_view, 12> months{"january",   "february", "march",    "april",
                                                  "may",       "june",     "july",     "august",
                                                  "september", "october",  "november", "december"};
constexpr std::array<std::string_view, 7> weekdays{"monday", "tuesday",  "wednesday", "thursday",
                                                   "friday", "saturday", "sunday"};

char lower(char c) {
    return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
}

bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

bool starts_with(std::string_view text, std::string_view word) {
    return text.size() >= word.size() && std::equal(word.begin(), word.end(), text.begin(),
                                                    [](char a, char b) { return a == lower(b); });
}

/// One to `most` digits; blanks before them are padding.
bool take_number(std::string_view& text, std::size_t most, int& value) {
    while (!text.empty() && text.front() == ' ')
        text.remove_prefix(1);
    std::size_t count = 0;
    while (count < most && count < text.size() && is_digit(text[count]))
        ++count;
    return count > 0 && take_digits(text, count, value);
}

/// A name in full or by its first three letters.
template <std::size_t n>
bool take_name(std::string_view& text, const std::array<std::string_view, n>& names, int& index) {
    for (std::size_t i = 0; i < n; ++i)
        for (const std::string_view word : {names[i], names[i].substr(0, 3)})
            if (starts_with(text, word)) {
                text.remove_prefix(word.size());
                index = static_cast<int>(i);
                return true;
            }
    return false;
}

std::string written_out(const std::string& form) {
    std::string plain;
    for (std::size_t i = 0; i < form.size(); ++i) {
        if (form[i] != '%' || i + 1 == form.size()) {
            plain += form[i];
            continue;
        }
        const char directive = form[++i];
        switch (directive) {
        case 'F':
            plain += "%Y-%m-%d";
            break;
        case 'T':
            plain += "%H:%M:%S";
            break;
        case 'R':
            plain += "%H:%M";
            break;
        case 'D':
            plain += "%m/%d/%y";
            break;
        case 'h':
            plain += "%b";
            break;
        case 'n':
        case 't':
            plain += ' ';
            break;
        default:
            plain += {'%', directive};
        }
    }
    return plain;
}

} // namespace

bool take_digits(std::string_view& text, std::size_t count, int& value) {
    if (text.size() < count)
        return false;
    value = 0;
    for (std::size_t i = 0; i < count; ++i) {
        if (!is_digit(text[i]))
            return false;
        value = value * 10 + (text[i] - '0');
    }
    text.remove_prefix(count);
    return true;
}

bool take_fraction(std::string_view& text, double& fraction) {
    std::size_t count = 0;
    double digits = 0.0, scale = 1.0;
    while (count < text.size() && is_digit(text[count])) {
        if (count < 15) {
            digits = digits * 10.0 + (text[count] - '0');
            scale *= 10.0;
        }
        ++count;
    }
    text.remove_prefix(count);
    fraction = digits / scale;
    return count > 0;
}

bool take_offset(std::string_view& text, double& offset_s) {
    if (text.empty())
        return false;
    const char sign = text.front();
    if (sign == 'Z' || sign == 'z') {
        text.remove_prefix(1);
        offset_s = 0.0;
        return true;
    }
    if (sign != '+' && sign != '-')
        return false;
    text.remove_prefix(1);
    int hours = 0, minutes = 0;
    if (!take_digits(text, 2, hours))
        return false;
    const bool colon = !text.empty() && text.front() == ':';
    if (colon)
        text.remove_prefix(1);
    if ((colon || (!text.empty() && is_digit(text.front()))) && !take_digits(text, 2, minutes))
        return false;
    if (hours > 15 || minutes > 59)
        return false;
    offset_s = (sign == '-' ? -1.0 : 1.0) * (hours * 3600.0 + minutes * 60.0);
    return true;
}

std::optional<double> seconds_of_day_begin(int year, int month, int day) {
    const std::chrono::year_month_day date{std::chrono::year{year},
                                           std::chrono::month{static_cast<unsigned>(month)},
                                           std::chrono::day{static_cast<unsigned>(day)}};
    if (!date.ok())
        return std::nullopt;
    return static_cast<double>(std::chrono::sys_days{date}.time_since_epoch().count()) * day_s;
}

/// What the directives of one stamp said.
struct TimeFormat::Parts {
    int year = 0, month = 1, day = 1, day_of_year = 0;
    int hour = 0, minute = 0;
    int half = -1; ///< 0: before noon, 1: after noon
    double second = 0.0;
    double fraction = 0.0;
    std::optional<double> offset_s;
    std::optional<double> unix_s;

    std::optional<ClockStamp> stamp() const {
        if (unix_s)
            return ClockStamp{*unix_s + fraction, 0.0};
        int clock_hour = hour;
        if (half >= 0) {
            if (hour < 1 || hour > 12)
                return std::nullopt;
            clock_hour = hour % 12 + 12 * half;
        }
        if (clock_hour > 24 || minute > 59 || second >= 61.0 ||
            (clock_hour == 24 && (minute > 0 || second > 0.0)))
            return std::nullopt;
        auto begin_s = seconds_of_day_begin(year, month, day);
        if (day_of_year > 0) {
            begin_s = seconds_of_day_begin(year, 1, 1);
            const bool leap = std::chrono::year{year}.is_leap();
            if (!begin_s || day_of_year > (leap ? 366 : 365))
                return std::nullopt;
            *begin_s += (day_of_year - 1) * day_s;
        }
        if (!begin_s)
            return std::nullopt;
        return ClockStamp{*begin_s + clock_hour * 3600.0 + minute * 60.0 + second + fraction,
                          offset_s};
    }
};

TimeFormat::TimeFormat(std::string form) : m_form{std::move(form)}, m_plain{written_out(m_form)} {
    const std::string known = "YymdejbBaAHIMSfpzs%";
    std::string seen;
    for (std::size_t i = 0; i < m_plain.size(); ++i) {
        if (m_plain[i] != '%')
            continue;
        if (i + 1 == m_plain.size())
            throw DataError{"time form '" + m_form + "' ends in a lone %; write %% for a % sign"};
        const char directive = m_plain[++i];
        if (known.find(directive) == std::string::npos)
            throw DataError{"time form '" + m_form + "': '%" + std::string{directive} +
                            "' is not known; use %Y %m %d %H %M %S %y %j %b %B %I %p %z %s"};
        if (directive != '%' && seen.find(directive) != std::string::npos)
            throw DataError{"time form '" + m_form + "': '%" + std::string{directive} +
                            "' stands twice; each part of a time is read once"};
        seen += directive;
    }
    require_a_time();
}

void TimeFormat::require_a_time() const {
    const auto has = [this](char directive) {
        for (std::size_t i = 0; i + 1 < m_plain.size(); ++i)
            if (m_plain[i] == '%' && m_plain[++i] == directive)
                return true;
        return false;
    };
    const auto lacks = [this](const std::string& what) {
        throw DataError{"time form '" + m_form + "' does not tell the " + what};
    };
    if (has('s'))
        return;
    if (!has('Y') && !has('y'))
        lacks("year; add %Y, or %y for two digits");
    const bool month = has('m') || has('b') || has('B');
    const bool day = has('d') || has('e');
    if (!has('j') && !(month && day))
        lacks("day; add %m and %d, or %j for the day of the year");
    if (!has('H') && !has('I'))
        lacks("hour; add %H");
    if (has('I') != has('p'))
        lacks("half of the day; %I and %p belong together");
    if (has('H') && has('I'))
        lacks("hour in one way; take %H, or %I with %p");
}

bool TimeFormat::take_directive(char directive, std::string_view& text, Parts& parts) {
    int number = 0;
    switch (directive) {
    case 'Y':
        return take_digits(text, 4, parts.year);
    case 'y':
        if (!take_digits(text, 2, number))
            return false;
        parts.year = number + (number < 69 ? 2000 : 1900);
        return true;
    case 'm':
        return take_number(text, 2, parts.month);
    case 'd':
    case 'e':
        return take_number(text, 2, parts.day);
    case 'j':
        return take_number(text, 3, parts.day_of_year) && parts.day_of_year > 0;
    case 'b':
    case 'B':
        if (!take_name(text, months, number))
            return false;
        parts.month = number + 1;
        return true;
    case 'a':
    case 'A':
        return take_name(text, weekdays, number);
    case 'H':
    case 'I':
        return take_number(text, 2, parts.hour);
    case 'M':
        return take_number(text, 2, parts.minute);
    case 'S':
        if (!take_number(text, 2, number))
            return false;
        parts.second = number;
        if (text.size() > 1 && (text.front() == '.' || text.front() == ',') && is_digit(text[1])) {
            text.remove_prefix(1);
            take_fraction(text, parts.fraction);
        }
        return true;
    case 'f':
        return take_fraction(text, parts.fraction);
    case 'p':
        if (!starts_with(text, "am") && !starts_with(text, "pm"))
            return false;
        parts.half = lower(text.front()) == 'p' ? 1 : 0;
        text.remove_prefix(2);
        return true;
    case 'z': {
        double offset_s = 0.0;
        if (!take_offset(text, offset_s))
            return false;
        parts.offset_s = offset_s;
        return true;
    }
    case 's': {
        double unix_s = 0.0;
        const auto [end, code] = std::from_chars(text.data(), text.data() + text.size(), unix_s,
                                                 std::chars_format::fixed);
        if (code != std::errc{} || !(std::abs(unix_s) < 1e12))
            return false;
        parts.unix_s = unix_s;
        text.remove_prefix(static_cast<std::size_t>(end - text.data()));
        return true;
    }
    default:
        return false;
    }
}

bool TimeFormat::take(std::string_view& text, Parts& parts) const {
    for (std::size_t i = 0; i < m_plain.size(); ++i) {
        const char c = m_plain[i];
        if (c == '%' && m_plain[i + 1] != '%') {
            if (!take_directive(m_plain[++i], text, parts))
                return false;
            continue;
        }
        if (c == ' ') {
            while (!text.empty() && (text.front() == ' ' || text.front() == '\t'))
                text.remove_prefix(1);
            continue;
        }
        if (c == '%')
            ++i;
        if (text.empty() || text.front() != c)
            return false;
        text.remove_prefix(1);
    }
    return true;
}

std::optional<ClockStamp> TimeFormat::parse(std::string_view text) const {
    Parts parts;
    if (!take(text, parts) || !text.empty())
        return std::nullopt;
    return parts.stamp();
}

std::optional<ClockStamp> TimeFormat::find(std::string_view text) const {
    std::optional<ClockStamp> found;
    for (std::size_t i = 0; i < text.size(); ++i) {
        if (i > 0 && is_digit(text[i - 1]) && is_digit(text[i]))
            continue;
        Parts parts;
        std::string_view rest = text.substr(i);
        if (!take(rest, parts) || (!rest.empty() && is_digit(rest.front())))
            continue;
        const auto stamp = parts.stamp();
        if (!stamp)
            continue;
        if (found)
            return std::nullopt;
        found = stamp;
        i = text.size() - rest.size();
    }
    return found;
}

} // namespace rillstrand::record

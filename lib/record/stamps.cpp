// SPDX-License-Identifier: Apache-2.0
#if defined(__GNUC__) && !defined(__clang__)
// The date library's parser, once inlined by g++ 12, sets off a false warning.
#pragma GCC diagnostic ignored "-Wmaybe-uninitialized"
#endif

#include "record/stamps.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <date/date.h>
#include <date/tz.h>

#include <charconv>
#include <chrono>
#include <cmath>
#include <sstream>

namespace rillstrand::record {

namespace {

constexpr double day_s = 86400.0;

/// Takes a fixed number of digits off the front.
bool take_digits(std::string_view& text, std::size_t count, int& value) {
    if (text.size() < count)
        return false;
    value = 0;
    for (std::size_t i = 0; i < count; ++i) {
        if (text[i] < '0' || text[i] > '9')
            return false;
        value = value * 10 + (text[i] - '0');
    }
    text.remove_prefix(count);
    return true;
}

bool take(std::string_view& text, char c) {
    if (text.empty() || text.front() != c)
        return false;
    text.remove_prefix(1);
    return true;
}

bool take_seconds(std::string_view& text, double& seconds) {
    int whole = 0;
    if (!take_digits(text, 2, whole) || whole > 60)
        return false;
    seconds = whole;
    if (text.empty() || (text.front() != '.' && text.front() != ','))
        return true;
    text.remove_prefix(1);
    double scale = 0.1;
    bool any = false;
    while (!text.empty() && text.front() >= '0' && text.front() <= '9') {
        seconds += scale * (text.front() - '0');
        scale *= 0.1;
        any = true;
        text.remove_prefix(1);
    }
    return any;
}

bool take_offset(std::string_view& text, std::optional<double>& offset_s) {
    while (take(text, ' ')) {
    }
    if (take(text, 'Z') || take(text, 'z')) {
        offset_s = 0.0;
        return true;
    }
    if (text.empty())
        return true;
    const bool minus = text.front() == '-';
    if (!minus && text.front() != '+')
        return false;
    text.remove_prefix(1);
    int hours = 0, minutes = 0;
    if (!take_digits(text, 2, hours))
        return false;
    take(text, ':');
    if (!text.empty() && !take_digits(text, 2, minutes))
        return false;
    if (hours > 15 || minutes > 59)
        return false;
    offset_s = (minus ? -1.0 : 1.0) * (hours * 3600.0 + minutes * 60.0);
    return true;
}

std::string_view trimmed(std::string_view text) {
    while (!text.empty() && (text.front() == ' ' || text.front() == '"'))
        text.remove_prefix(1);
    while (!text.empty() && (text.back() == ' ' || text.back() == '"'))
        text.remove_suffix(1);
    return text;
}

std::string in_quotes(std::string_view stamp) {
    return "'" + std::string{stamp} + "'";
}

} // namespace

std::optional<IsoStamp> parse_iso(std::string_view text) {
    text = trimmed(text);
    int year = 0, month = 0, day = 0, hour = 0, minute = 0;
    if (!take_digits(text, 4, year) || !take(text, '-') || !take_digits(text, 2, month) ||
        !take(text, '-') || !take_digits(text, 2, day))
        return std::nullopt;
    const std::chrono::year_month_day date{std::chrono::year{year},
                                           std::chrono::month{static_cast<unsigned>(month)},
                                           std::chrono::day{static_cast<unsigned>(day)}};
    if (!date.ok())
        return std::nullopt;
    if (!take(text, 'T') && !take(text, ' ') && !take(text, 't'))
        return std::nullopt;
    if (!take_digits(text, 2, hour) || !take(text, ':') || !take_digits(text, 2, minute))
        return std::nullopt;
    IsoStamp stamp;
    double seconds = 0.0;
    if (take(text, ':') && !take_seconds(text, seconds))
        return std::nullopt;
    if (!take_offset(text, stamp.offset_s) || !text.empty())
        return std::nullopt;
    if (hour > 24 || minute > 59 || (hour == 24 && (minute > 0 || seconds > 0.0)))
        return std::nullopt;
    stamp.clock_s =
        static_cast<double>(std::chrono::sys_days{date}.time_since_epoch().count()) * day_s +
        hour * 3600.0 + minute * 60.0 + seconds;
    return stamp;
}

std::optional<std::string> find_iso(std::string_view text) {
    std::optional<std::string> found;
    for (std::size_t i = 0; i + 16 <= text.size(); ++i) {
        if (text[i] < '0' || text[i] > '9' || (i > 0 && text[i - 1] >= '0' && text[i - 1] <= '9'))
            continue;
        // The longest reading that starts here; "+02:00" and fractions make up to 40 characters.
        for (std::size_t n = std::min<std::size_t>(40, text.size() - i); n >= 16; --n) {
            if (text[i + n - 1] == ' ' || !parse_iso(text.substr(i, n)))
                continue;
            if (found)
                return std::nullopt;
            found = std::string{text.substr(i, n)};
            i += n - 1;
            break;
        }
    }
    return found;
}

StampReader::StampReader(const campaign::Record& record)
    : m_zone_name{record.time_zone}, m_format{record.text.time_format.value_or("")} {
    if (m_zone_name == "UTC" || m_zone_name == "Etc/UTC")
        return;
    try {
        m_zone = date::locate_zone(m_zone_name);
    } catch (const std::exception&) {
        std::vector<std::string> names;
        for (const auto& zone : date::get_tzdb().zones)
            names.push_back(zone.name());
        const std::string near = text::nearest(m_zone_name, names);
        throw DataError{"record.time_zone: there is no zone " + in_quotes(m_zone_name) +
                        (near.empty() ? "; write an IANA name such as Europe/Berlin"
                                      : "; did you mean '" + near + "'?")};
    }
}

double StampReader::read(std::string_view stamp, std::optional<double> previous_s,
                         const std::string& format) const {
    const std::string_view text = trimmed(stamp);
    const std::string& used = format.empty() ? m_format : format;
    if (used.empty()) {
        const auto iso = parse_iso(text);
        if (!iso)
            throw DataError{"time " + in_quotes(text) +
                            " is not ISO 8601 (2031-04-05T06:07:08Z); say record.text.time_format"};
        if (iso->offset_s)
            return iso->clock_s - *iso->offset_s;
        return to_utc(iso->clock_s, text, previous_s);
    }
    std::istringstream stream{std::string{text}};
    stream.imbue(std::locale::classic());
    date::local_time<std::chrono::microseconds> local{};
    std::string zone_text;
    std::chrono::minutes offset{std::chrono::minutes::min()};
    date::from_stream(stream, used.c_str(), local, &zone_text, &offset);
    if (stream.fail() || (stream.peek() != std::char_traits<char>::eof()))
        throw DataError{"time " + in_quotes(text) + " does not read as " + in_quotes(used) +
                        "; correct the stamp or record.text.time_format"};
    const double clock_s = static_cast<double>(local.time_since_epoch().count()) * 1e-6;
    if (offset != std::chrono::minutes::min())
        return clock_s - 60.0 * static_cast<double>(offset.count());
    return to_utc(clock_s, text, previous_s);
}

double StampReader::to_utc(double local_s, std::string_view stamp,
                           std::optional<double> previous_s) const {
    if (m_zone == nullptr)
        return local_s;
    const double whole_s = std::floor(local_s);
    const date::local_seconds local{std::chrono::seconds{static_cast<long long>(whole_s)}};
    const date::local_info info = m_zone->get_info(local);
    const auto with = [local_s](const date::sys_info& zone) {
        return local_s - static_cast<double>(zone.offset.count());
    };
    if (info.result == date::local_info::nonexistent)
        throw DataError{"time " + in_quotes(stamp) + " does not exist in " + m_zone_name +
                        ", where clocks were put forward over it; set record.time_zone to the zone "
                        "that the clock really kept, such as Etc/UTC or Etc/GMT-1"};
    if (info.result == date::local_info::unique)
        return with(info.first);
    if (!previous_s)
        throw DataError{
            "time " + in_quotes(stamp) + " stands twice in " + m_zone_name +
            ", where clocks were put back, and no stamp before it tells which is meant; "
            "give stamps with an offset or leave this part out"};
    const double first_s = with(info.first);
    return first_s > *previous_s ? first_s : with(info.second);
}

} // namespace rillstrand::record

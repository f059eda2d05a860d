// SPDX-License-Identifier: Apache-2.0
#include "record/stamps.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <date/tz.h>

#include <algorithm>
#include <cmath>

namespace rillstrand::record {

namespace {

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
    double fraction = 0.0;
    if ((take(text, '.') || take(text, ',')) && !take_fraction(text, fraction))
        return false;
    seconds += fraction;
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
    constexpr std::size_t longest = 60;
    return "'" + std::string{stamp.substr(0, longest)} + (stamp.size() > longest ? "…'" : "'");
}

/// Date and clock of the extended or the basic form.
bool take_iso_clock(std::string_view& text, double& clock_s) {
    int year = 0, month = 0, day = 0, hour = 0, minute = 0;
    if (!take_digits(text, 4, year))
        return false;
    const bool extended = take(text, '-');
    if (!take_digits(text, 2, month) || (extended && !take(text, '-')) ||
        !take_digits(text, 2, day))
        return false;
    if (!take(text, 'T') && !take(text, 't')) {
        if (!extended || !take(text, ' '))
            return false;
        while (take(text, ' ')) {
        }
    }
    double seconds = 0.0;
    if (!take_digits(text, 2, hour) || (extended && !take(text, ':')) ||
        !take_digits(text, 2, minute))
        return false;
    const bool more =
        extended ? take(text, ':') : !text.empty() && text[0] >= '0' && text[0] <= '9';
    if (more && !take_seconds(text, seconds))
        return false;
    const auto begin_s = seconds_of_day_begin(year, month, day);
    if (!begin_s || hour > 24 || minute > 59 || (hour == 24 && (minute > 0 || seconds > 0.0)))
        return false;
    clock_s = *begin_s + hour * 3600.0 + minute * 60.0 + seconds;
    return true;
}

} // namespace

std::optional<ClockStamp> parse_iso(std::string_view text) {
    text = trimmed(text);
    ClockStamp stamp;
    if (!take_iso_clock(text, stamp.clock_s))
        return std::nullopt;
    while (take(text, ' ')) {
    }
    if (text.empty())
        return stamp;
    double offset_s = 0.0;
    if (!take_offset(text, offset_s) || !text.empty())
        return std::nullopt;
    stamp.offset_s = offset_s;
    return stamp;
}

std::optional<std::string> find_iso(std::string_view text) {
    constexpr std::size_t shortest = 13, longest = 40; // with fraction and offset
    std::optional<std::string> found;
    for (std::size_t i = 0; i + shortest <= text.size(); ++i) {
        if (text[i] < '0' || text[i] > '9' || (i > 0 && text[i - 1] >= '0' && text[i - 1] <= '9'))
            continue;
        for (std::size_t n = std::min(longest, text.size() - i); n >= shortest; --n) {
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

namespace {

const date::time_zone* find_zone(const std::string& name) {
    if (name == "UTC" || name == "Etc/UTC")
        return nullptr;
    try {
        return date::locate_zone(name);
    } catch (const std::exception&) {
        std::vector<std::string> names;
        for (const auto& zone : date::get_tzdb().zones)
            names.push_back(zone.name());
        const std::string near = text::nearest(name, names);
        throw DataError{"record.time_zone: there is no zone " + in_quotes(name) +
                        (near.empty() ? "; write an IANA name such as Europe/Berlin"
                                      : "; did you mean '" + near + "'?")};
    }
}

std::optional<TimeFormat> format_of(const std::optional<std::string>& form, const char* key) {
    if (!form)
        return std::nullopt;
    try {
        return TimeFormat{*form};
    } catch (const DataError& error) {
        throw DataError{std::string{key} + ": " + error.what()};
    }
}

} // namespace

StampReader::StampReader(const campaign::Record& record)
    : m_zone{find_zone(record.time_zone)}, m_zone_name{record.time_zone},
      m_format{format_of(record.text.time_format, "record.text.time_format")},
      m_name_format{format_of(record.text.time_from_name, "record.text.time_from_name")} {}

bool StampReader::fits(std::string_view stamp) const {
    const std::string_view text = trimmed(stamp);
    return m_format ? m_format->parse(text).has_value() : parse_iso(text).has_value();
}

ClockStamp StampReader::read(std::string_view stamp) const {
    const std::string_view text = trimmed(stamp);
    if (m_format) {
        if (const auto found = m_format->parse(text))
            return *found;
        throw DataError{"time " + in_quotes(text) + " does not read as " +
                        in_quotes(m_format->form()) +
                        "; correct the stamp or record.text.time_format"};
    }
    if (const auto found = parse_iso(text))
        return *found;
    throw DataError{"time " + in_quotes(text) +
                    " is not ISO 8601 (2031-04-05T06:07:08Z); say record.text.time_format"};
}

ClockStamp StampReader::read_name(const std::string& name) const {
    if (auto whole = m_name_format->parse(name))
        return *whole;
    const std::size_t dot = name.rfind('.');
    if (dot != std::string::npos && dot > 0)
        if (auto stem = m_name_format->parse(std::string_view{name}.substr(0, dot)))
            return *stem;
    if (auto part = m_name_format->find(name))
        return *part;
    throw DataError{"the name does not hold one time of the form " +
                    in_quotes(m_name_format->form()) +
                    "; correct record.text.time_from_name or the file's name"};
}

namespace {

/// The zone database ends with 2037 and then keeps the last offset, though the rules go on. A date
/// after that is read as the date of 2026 to 2037 that has the same weekday and the same day and
/// month: rules name weekdays of months. Years are counted from March, so that leap days do not
/// matter.
double date_with_rules(double local_s) {
    using std::chrono::days;
    const auto day = std::chrono::floor<days>(std::chrono::sys_seconds{
        std::chrono::seconds{static_cast<long long>(std::floor(local_s))}});
    const std::chrono::year_month_day date{day};
    const auto march_of = [](std::chrono::year year) {
        return std::chrono::sys_days{year / std::chrono::March / 1};
    };
    const std::chrono::year from =
        date.month() >= std::chrono::March ? date.year() : date.year() - std::chrono::years{1};
    const std::chrono::weekday weekday{march_of(from)};
    for (std::chrono::year to{2026}; to <= std::chrono::year{2036}; ++to)
        if (std::chrono::weekday{march_of(to)} == weekday) {
            const days moved = march_of(to) - march_of(from);
            return local_s + static_cast<double>(moved.count()) * 86400.0;
        }
    return local_s;
}

date::local_info info_at(const date::time_zone& zone, double local_s) {
    const auto whole_s = static_cast<long long>(std::floor(local_s));
    return zone.get_info(date::local_seconds{std::chrono::seconds{whole_s}});
}

} // namespace

LocalOffsets offsets_at(const date::time_zone* zone, double local_s) {
    if (zone == nullptr)
        return {};
    date::local_info info = info_at(*zone, local_s);
    const date::sys_days last_rules{date::year{2037} / 1 / 1};
    const date::sys_days no_end{date::year{9999} / 1 / 1};
    if (info.result == date::local_info::unique && info.first.begin >= last_rules &&
        info.first.end > no_end)
        info = info_at(*zone, date_with_rules(local_s));
    LocalOffsets offsets;
    offsets.first_s = static_cast<double>(info.first.offset.count());
    offsets.second_s = offsets.first_s;
    if (info.result == date::local_info::nonexistent)
        offsets.kind = LocalOffsets::Kind::skipped;
    if (info.result == date::local_info::ambiguous) {
        offsets.kind = LocalOffsets::Kind::twice;
        offsets.second_s = static_cast<double>(info.second.offset.count());
    }
    return offsets;
}

void ClockSequence::refuse(const Place& place, const std::string& what) {
    throw DataError{place.file.string() +
                    (place.line > 0 ? ":" + std::to_string(place.line) : std::string{}) +
                    ": time " + in_quotes(trimmed(place.text)) + " " + what};
}

bool ClockSequence::usual_step(double step_s) const {
    // Clocks jitter by far less than a quarter of a step (common practice, no source).
    return m_step_s && std::abs(step_s - *m_step_s) <= 0.25 * *m_step_s;
}

void ClockSequence::note(double time_s) {
    if (m_last_s && time_s > *m_last_s)
        m_step_s = std::min(m_step_s.value_or(time_s - *m_last_s), time_s - *m_last_s);
    m_last_s = time_s;
}

double ClockSequence::next(const ClockStamp& stamp, std::string_view text,
                           const std::filesystem::path& file, std::size_t line) {
    double time_s = stamp.clock_s;
    if (stamp.offset_s) {
        time_s -= *stamp.offset_s;
    } else if (m_stamps.zone() != nullptr) {
        const LocalOffsets offsets = offsets_at(m_stamps.zone(), stamp.clock_s);
        if (offsets.kind == LocalOffsets::Kind::skipped)
            refuse({std::string{text}, file, line},
                   "does not exist in " + m_stamps.zone_name() +
                       ", where clocks were put forward over it; set record.time_zone to the zone "
                       "that the clock really kept, such as Etc/UTC or Etc/GMT-1");
        if (offsets.kind == LocalOffsets::Kind::twice)
            return in_repeated_hour(stamp, offsets, {std::string{text}, file, line});
        time_s -= offsets.first_s;
    } else {
        return time_s; // nothing repeats: no book-keeping
    }
    leave_repeated_hour(time_s);
    note(time_s);
    return time_s;
}

double ClockSequence::in_repeated_hour(const ClockStamp& stamp, const LocalOffsets& offsets,
                                       const Place& place) {
    const double first_s = stamp.clock_s - offsets.first_s;
    const double second_s = stamp.clock_s - offsets.second_s;
    const bool far = m_pass > 0 && std::abs(stamp.clock_s - m_last_clock_s) > 43200.0;
    if (far)
        leave_repeated_hour(first_s); // of another year
    const bool back = m_pass > 0 && stamp.clock_s <= m_last_clock_s;
    // A further file may begin inside the hour again.
    const bool anew = back && m_pass == 2 && place.file != m_run.file;
    if (m_pass == 0 || anew) {
        m_run = place;
        m_back_s = second_s - first_s;
        m_pass = 1;
        m_certain = m_last_s && usual_step(first_s - *m_last_s);
    } else if (back) {
        if (m_pass == 2)
            refuse(place, "goes back a second time in the hour that stands twice in " +
                              m_stamps.zone_name() +
                              ", so its order does not tell which is meant; give stamps with an "
                              "offset or sort the rows");
        m_pass = 2;
        m_certain = true;
    }
    m_last_clock_s = stamp.clock_s;
    const double time_s = m_pass == 1 ? first_s : second_s;
    note(time_s);
    return time_s;
}

void ClockSequence::leave_repeated_hour(std::optional<double> next_s) {
    if (m_pass == 0)
        return;
    const bool once = m_pass == 1;
    m_pass = 0;
    if (!once)
        return;
    const double pause_s = next_s && m_last_s ? *next_s - *m_last_s : -1.0;
    const bool first_goes_on = usual_step(pause_s);
    const bool second_goes_on = usual_step(pause_s - m_back_s);
    if (m_certain && second_goes_on && !first_goes_on)
        refuse(m_run, "and those after it stand once, without a pause, though clocks were put back "
                      "over them in " +
                          m_stamps.zone_name() +
                          "; set record.time_zone to the zone that the clock really kept, such as "
                          "Etc/UTC or Etc/GMT-1");
    if (!m_certain && !first_goes_on)
        refuse(m_run, "stands twice in " + m_stamps.zone_name() +
                          ", where clocks were put back, and no stamp around it tells which is "
                          "meant; give stamps with an offset or leave this part out");
}

void ClockSequence::finish() {
    leave_repeated_hour(std::nullopt);
}

} // namespace rillstrand::record

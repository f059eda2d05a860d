// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"
#include "record/time_format.hpp"

#include <filesystem>
#include <optional>
#include <string>
#include <string_view>

namespace date {
class time_zone;
}

namespace rillstrand::record {

/// ISO 8601 date and time: `2031-04-05T06:07:08.5+02:00`, also with a blank for the T, without
/// seconds, without offset, or in the basic form `20310405T060708Z`.
/// @return nothing if the text is not that through and through
std::optional<ClockStamp> parse_iso(std::string_view text);

/// The part of a text that reads as an ISO 8601 date and time, if there is exactly one.
std::optional<std::string> find_iso(std::string_view text);

/// Reads stamps as the campaign says they are written.
class StampReader {
public:
    /// @throws DataError if the zone is unknown, with the nearest name, or a time form is wrong
    explicit StampReader(const campaign::Record& record);

    /// A stamp in the campaign's `time_format`, or ISO 8601 where it says none.
    /// @throws DataError with what is wrong (no file or line: the caller puts them before it)
    ClockStamp read(std::string_view stamp) const;
    /// Whether `read` would take it.
    bool fits(std::string_view stamp) const;
    /// The stamp in a file's name by `time_from_name`: the whole name with or without its ending,
    /// or the one part of it that fits.
    /// @throws DataError if there is none
    ClockStamp read_name(const std::string& name) const;
    const date::time_zone* zone() const { return m_zone; } ///< nullptr: UTC
    const std::string& zone_name() const { return m_zone_name; }

private:
    const date::time_zone* m_zone = nullptr;
    std::string m_zone_name;
    std::optional<TimeFormat> m_format;
    std::optional<TimeFormat> m_name_format;
};

/// Offsets that a zone's clock may have had at a local time.
struct LocalOffsets {
    enum class Kind { one, skipped, twice } kind = Kind::one;
    double first_s = 0.0;  ///< UTC = local - offset; where the hour stands twice: the first pass
    double second_s = 0.0; ///< the second pass
};
/// As the system's zone database says; after its last year (2037) as its last rules would go on.
/// @param zone  nullptr: UTC
LocalOffsets offsets_at(const date::time_zone* zone, double local_s);

/// Stamps of one clock in the order in which it wrote them, turned into UTC.
///
/// A local time that a change of the clock skipped is refused. An hour that it repeats is read by
/// the order: where the stamps step back inside it, the first pass comes before the step and the
/// second behind it. Where they do not step back, the pass that goes on in the usual steps of the
/// stamps before it is taken; if nothing tells, or if the stamps run through the hour once without
/// the pause that a clock put back would leave, they are refused.
class ClockSequence {
public:
    explicit ClockSequence(const StampReader& stamps) : m_stamps{stamps} {}
    /// @param line  0: the stamp stands for the whole file
    /// @return UTC seconds since 1970-01-01, as stamped: neither the clock's offset nor the place
    ///         in the averaging interval is applied yet
    /// @throws DataError with file and line
    double next(const ClockStamp& stamp, std::string_view text, const std::filesystem::path& file,
                std::size_t line);
    /// No more stamps come.
    /// @throws DataError if the last ones stand twice and nothing told which is meant
    void finish();

private:
    struct Place {
        std::string text;
        std::filesystem::path file;
        std::size_t line = 0;
    };
    double in_repeated_hour(const ClockStamp& stamp, const LocalOffsets& offsets,
                            const Place& place);
    void leave_repeated_hour(std::optional<double> next_s);
    bool usual_step(double step_s) const;
    [[noreturn]] static void refuse(const Place& place, const std::string& what);
    void note(double time_s);

    const StampReader& m_stamps;
    std::optional<double> m_last_s;
    std::optional<double> m_step_s; ///< shortest so far
    int m_pass = 0;                 ///< 0: outside a repeated hour
    bool m_certain = false;         ///< of the pass
    double m_last_clock_s = 0.0;    ///< inside a repeated hour
    double m_back_s = 0.0;          ///< by how much the clock was put back
    Place m_run;                    ///< first stamp of the repeated hour
};

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <memory>
#include <optional>
#include <string>
#include <string_view>

namespace date {
class time_zone;
}

namespace rillstrand::record {

/// Turns stamps as instruments write them into UTC.
///
/// ISO 8601 (`2031-04-05T06:07:08.5+02:00`, also with a blank for the T, without seconds, without
/// offset), or the campaign's own `time_format`. A stamp without an offset is in the record's zone
/// (IANA names, system zone database). A local time that a change of the clock skipped is refused;
/// one that it repeats is told by the order of the stamps.
class StampReader {
public:
    /// @throws DataError if the zone is unknown, with the nearest name
    explicit StampReader(const campaign::Record& record);

    /// @param stamp       text of one stamp
    /// @param format      strftime-like, empty: the campaign's, or ISO 8601
    /// @param previous_s  UTC of the stamp before it in the same sequence, for repeated hours
    /// @return UTC seconds since 1970-01-01 as stamped: neither the clock's offset nor the place in
    ///         the averaging interval is applied yet
    /// @throws DataError with what is wrong (no file or line: the caller puts them before it)
    double read(std::string_view stamp, std::optional<double> previous_s,
                const std::string& format = {}) const;

private:
    double to_utc(double local_s, std::string_view stamp, std::optional<double> previous_s) const;
    const date::time_zone* m_zone = nullptr; ///< nullptr: UTC
    std::string m_zone_name;
    std::string m_format;
};

/// ISO 8601 to seconds since 1970-01-01 of its own clock, and the offset if one is written.
struct IsoStamp {
    double clock_s = 0.0;
    std::optional<double> offset_s;
};
/// @return nothing if the text is not ISO 8601 through and through
std::optional<IsoStamp> parse_iso(std::string_view text);

/// The part of a text that reads as an ISO 8601 date and time, if there is exactly one.
std::optional<std::string> find_iso(std::string_view text);

} // namespace rillstrand::record

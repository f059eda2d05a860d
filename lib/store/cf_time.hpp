// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>
#include <string_view>

/// Times as the CF conventions write them; included by sources of this room only.
namespace rillstrand::store {

/// What `<unit> since <date>` means: UTC = epoch_s + value * unit_s.
struct TimeUnits {
    double epoch_s = 0.0; ///< seconds since 1970-01-01T00:00:00Z
    double unit_s = 1.0;
    bool zone_said = false;
    /// @return whole milliseconds where the value is within 0.05 ms of one
    double to_utc_s(double value) const;
};

/// Calendars standard, gregorian and proleptic_gregorian (or none said); units from nanoseconds to
/// weeks. Source: CF conventions 1.11, section 4.4.
/// @throws DataError (no file before it) if the units, the date or the calendar are others, or a
///         mixed calendar counts from before 1582-10-15
TimeUnits read_time_units(std::string_view units, std::string_view calendar);

/// Whether a text has the form of such units.
bool looks_like_time_units(std::string_view units);

} // namespace rillstrand::store

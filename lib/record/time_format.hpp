// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// A stamp as its clock wrote it: seconds since 1970-01-01 of that clock, and the offset if one is
/// written (UTC = clock - offset).
struct ClockStamp {
    double clock_s = 0.0;
    std::optional<double> offset_s;
};

/// A stamp's form as the campaign writes it, strftime-like: `%d.%m.%Y %H:%M:%S`.
///
/// %Y %y %m %d %e %j %b %B %h %a %A %H %I %M %S (with a fraction, if any) %f %p %z %s %F %T %R %D
/// %n %t %%; months and days of the week are English. A blank stands for any number of blanks. Two-
/// digit years are 1969 to 2068 as in POSIX strptime.
class TimeFormat {
public:
    /// @throws DataError naming the directive that is not known, that stands twice, or what the
    ///         form lacks to be a time
    explicit TimeFormat(std::string form);

    /// @return nothing if the text does not fit from its first to its last character
    std::optional<ClockStamp> parse(std::string_view text) const;
    /// The one part of a text that fits and has no digit before or behind it.
    /// @return nothing if there is none or several
    std::optional<ClockStamp> find(std::string_view text) const;
    const std::string& form() const { return m_form; }

private:
    struct Parts;
    bool take(std::string_view& text, Parts& parts) const;
    static bool take_directive(char directive, std::string_view& text, Parts& parts);
    void require_a_time() const;
    std::string m_form;
    std::string m_plain; ///< with %F, %T, %R, %D written out
};

/// Takes a fixed number of digits off the front.
bool take_digits(std::string_view& text, std::size_t count, int& value);
/// `+02:00`, `-0330`, `+02` or `Z` off the front.
bool take_offset(std::string_view& text, double& offset_s);
/// Digits of a fraction off the front, as a part of one.
bool take_fraction(std::string_view& text, double& fraction);
/// @return nothing if there is no such day
std::optional<double> seconds_of_day_begin(int year, int month, int day);

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

/// Text of numbers and names, whatever the locale.
namespace rillstrand::text {

/// The shortest text that gives the same double back; `nan` for NaN.
std::string number(double value);

/// Fixed notation with so many digits after the point; a zero never carries a minus sign.
std::string fixed(double value, int decimals);

/// A finite number that fills the whole text (a leading plus sign and blanks around are allowed),
/// or nothing.
std::optional<double> parse_number(std::string_view text);

/// `YYYY-MM-DDThh:mm:ssZ` of UTC seconds since 1970-01-01, with milliseconds where there are any;
/// the empty text for NaN.
std::string iso_time(double unix_s);

/// Lower case with every run of characters other than a-z, 0-9 replaced by one `_`: the form of
/// names in file and layer names.
std::string slug(std::string_view name);

/// Number of single-character edits (insert, delete, replace, exchange of neighbours) from a to b.
std::size_t edit_distance(std::string_view a, std::string_view b);

/// The candidate nearest to a misspelt word, or the empty text where none is near.
std::string nearest(std::string_view word, const std::vector<std::string>& candidates);

} // namespace rillstrand::text

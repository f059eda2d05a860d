// SPDX-License-Identifier: Apache-2.0
#include "record/columns.hpp"

#include "record/text_input.hpp"

#include <algorithm>
#include <cctype>

namespace rillstrand::record {

namespace {

std::string lower(std::string_view text) {
    std::string result{text};
    std::transform(result.begin(), result.end(), result.begin(),
                   [](unsigned char c) { return static_cast<char>(std::tolower(c)); });
    return result;
}

/// A column's name without its unit, and the unit: `Temperature [K]`, `distance_km`.
struct ColumnName {
    std::string name;
    std::string unit;
};

ColumnName column_name(std::string_view header) {
    ColumnName result{lower(trim(header)), {}};
    const std::size_t open = result.name.find_first_of("[(");
    if (open == std::string::npos || open == 0)
        return result;
    const std::size_t close = result.name.find_first_of("])", open);
    if (close == std::string::npos)
        return result;
    result.unit = std::string{trim(result.name.substr(open + 1, close - open - 1))};
    result.name = std::string{trim(result.name.substr(0, open))};
    return result;
}

} // namespace

std::optional<std::size_t> find_column(const std::vector<std::string>& header,
                                       const std::string& name, std::string& unit) {
    unit.clear();
    for (std::size_t i = 0; i < header.size(); ++i)
        if (header[i] == name) {
            unit = column_name(header[i]).unit;
            return i;
        }
    const std::string wanted = lower(trim(name));
    if (wanted.empty())
        return std::nullopt;
    // Headers of wide tables are long and hold numbers: their first letter tells enough.
    const auto cannot_be = [&wanted](const std::string& cell) {
        const std::size_t first = cell.find_first_not_of(" \t\r");
        return first == std::string::npos || lower(cell.substr(first, 1)) != wanted.substr(0, 1);
    };
    for (std::size_t i = 0; i < header.size(); ++i) {
        if (cannot_be(header[i]))
            continue;
        const ColumnName given = column_name(header[i]);
        if (given.name == wanted) {
            unit = given.unit;
            return i;
        }
    }
    for (std::size_t i = 0; i < header.size(); ++i) {
        if (cannot_be(header[i]))
            continue;
        const std::string given = lower(trim(header[i]));
        if (given.rfind(wanted + "_", 0) != 0)
            continue;
        const std::string ending = given.substr(wanted.size() + 1);
        for (const char* known : {"m", "km", "ft", "c", "degc", "k", "degf", "f", "utc"})
            if (ending == known) {
                unit = ending;
                return i;
            }
    }
    return std::nullopt;
}

std::optional<campaign::TemperatureUnit> temperature_unit_of(const std::string& unit) {
    for (const char* word : {"c", "degc", "°c", "deg c", "deg. c", "celsius"})
        if (unit == word)
            return campaign::TemperatureUnit::degC;
    if (unit == "k" || unit == "kelvin")
        return campaign::TemperatureUnit::kelvin;
    for (const char* word : {"f", "degf", "°f", "deg f", "deg. f", "fahrenheit"})
        if (unit == word)
            return campaign::TemperatureUnit::degF;
    return std::nullopt;
}

std::optional<campaign::DistanceUnit> distance_unit_of(const std::string& unit) {
    if (unit == "m" || unit == "metre" || unit == "metres")
        return campaign::DistanceUnit::metre;
    if (unit == "km")
        return campaign::DistanceUnit::kilometre;
    if (unit == "ft" || unit == "feet")
        return campaign::DistanceUnit::foot;
    return std::nullopt;
}

bool looks_decimal_comma(std::string_view cell) {
    const std::size_t comma = cell.find(',');
    if (comma == std::string_view::npos || cell.find(',', comma + 1) != std::string_view::npos ||
        comma + 1 == cell.size())
        return false;
    return std::all_of(cell.begin(), cell.end(), [](char c) {
        return (c >= '0' && c <= '9') || c == ',' || c == '-' || c == '+' || c == 'e' || c == 'E';
    });
}

std::string listed(const std::vector<std::string>& header) {
    constexpr std::size_t most = 12, longest = 40;
    std::string list;
    for (std::size_t i = 0; i < header.size() && i < most; ++i) {
        const bool cut = header[i].size() > longest;
        list += (i > 0 ? ", '" : "'") + header[i].substr(0, longest) + (cut ? "…'" : "'");
    }
    return header.size() > most ? list + ", …" : list;
}

} // namespace rillstrand::record

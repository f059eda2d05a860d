// SPDX-License-Identifier: Apache-2.0
#include "store/grid_axes.hpp"

#include "base/text.hpp"
#include "record/cells.hpp"
#include "store/cf_time.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rillstrand::store {

namespace {

using campaign::DistanceUnit;
using campaign::TemperatureUnit;
using Dimension = std::shared_ptr<GDALDimension>;

std::string quoted_list(const std::vector<std::string>& names) {
    std::string list;
    for (const auto& name : names)
        list += (list.empty() ? "" : ", ") + name;
    return list.empty() ? "nothing" : list;
}

template <typename Unit, std::size_t N>
std::optional<Unit> known_unit(const std::array<std::pair<const char*, Unit>, N>& known,
                               const std::string& unit) {
    for (const auto& [name, value] : known)
        if (unit == name)
            return value;
    return {};
}

std::optional<TemperatureUnit> temperature_unit_of(const std::string& unit) {
    static constexpr std::array<std::pair<const char*, TemperatureUnit>, 26> known{{
        {"degC", TemperatureUnit::degC},           {"deg_C", TemperatureUnit::degC},
        {"degree_C", TemperatureUnit::degC},       {"degrees_C", TemperatureUnit::degC},
        {"degreeC", TemperatureUnit::degC},        {"degreesC", TemperatureUnit::degC},
        {"celsius", TemperatureUnit::degC},        {"Celsius", TemperatureUnit::degC},
        {"degree_Celsius", TemperatureUnit::degC}, {"degrees_Celsius", TemperatureUnit::degC},
        {"degree_celsius", TemperatureUnit::degC}, {"degrees_celsius", TemperatureUnit::degC},
        {"\u00b0C", TemperatureUnit::degC},        {"C", TemperatureUnit::degC},
        {"deg C", TemperatureUnit::degC},          {"K", TemperatureUnit::kelvin},
        {"kelvin", TemperatureUnit::kelvin},       {"Kelvin", TemperatureUnit::kelvin},
        {"degK", TemperatureUnit::kelvin},         {"degF", TemperatureUnit::degF},
        {"deg_F", TemperatureUnit::degF},          {"degree_F", TemperatureUnit::degF},
        {"degrees_F", TemperatureUnit::degF},      {"fahrenheit", TemperatureUnit::degF},
        {"Fahrenheit", TemperatureUnit::degF},     {"\u00b0F", TemperatureUnit::degF},
    }};
    return known_unit(known, unit);
}

std::optional<DistanceUnit> distance_unit_of(const std::string& unit) {
    static constexpr std::array<std::pair<const char*, DistanceUnit>, 14> known{{
        {"m", DistanceUnit::metre},
        {"metre", DistanceUnit::metre},
        {"metres", DistanceUnit::metre},
        {"meter", DistanceUnit::metre},
        {"meters", DistanceUnit::metre},
        {"km", DistanceUnit::kilometre},
        {"kilometre", DistanceUnit::kilometre},
        {"kilometres", DistanceUnit::kilometre},
        {"kilometer", DistanceUnit::kilometre},
        {"kilometers", DistanceUnit::kilometre},
        {"ft", DistanceUnit::foot},
        {"foot", DistanceUnit::foot},
        {"feet", DistanceUnit::foot},
        {"international_foot", DistanceUnit::foot},
    }};
    return known_unit(known, unit);
}

const char* word(TemperatureUnit unit) {
    return unit == TemperatureUnit::degC ? "degC" : unit == TemperatureUnit::kelvin ? "K" : "degF";
}

const char* word(DistanceUnit unit) {
    return unit == DistanceUnit::metre ? "m" : unit == DistanceUnit::kilometre ? "km" : "ft";
}

/// One-dimensional numeric variables along a dimension, that of the dimension's own name first.
std::vector<Array> variables_along(const GdalGrid& grid, const Dimension& dimension) {
    std::vector<Array> found;
    for (const auto& name : grid.names()) {
        Array array = grid.find(name);
        if (!array || !is_numeric(array) || array->GetDimensionCount() != 1)
            continue;
        if (array->GetDimensions().front()->GetFullName() != dimension->GetFullName())
            continue;
        const bool own = name == dimension->GetName();
        found.insert(own ? found.begin() : found.end(), std::move(array));
    }
    return found;
}

bool is_time(const Array& array) {
    return looks_like_time_units(unit_of(array));
}

Array time_along(const GdalGrid& grid, const Dimension& dimension) {
    const auto candidates = variables_along(grid, dimension);
    const auto found = std::find_if(candidates.begin(), candidates.end(), is_time);
    return found == candidates.end() ? nullptr : *found;
}

/// The variable of the dimension's name; else the only one with a unit of length; else the only
/// one.
Array distance_along(const GdalGrid& grid, const Dimension& dimension) {
    const auto candidates = variables_along(grid, dimension);
    if (!candidates.empty() && candidates.front()->GetName() == dimension->GetName())
        return candidates.front();
    std::vector<Array> lengths;
    for (const auto& array : candidates)
        if (distance_unit_of(unit_of(array)) && text_of(array, "positive").empty())
            lengths.push_back(array);
    if (lengths.size() == 1)
        return lengths.front();
    if (lengths.empty() && candidates.size() == 1)
        return candidates.front();
    std::vector<std::string> names;
    for (const auto& array : candidates)
        names.push_back(array->GetName());
    grid.refuse("the fibre distances of dimension \"" + dimension->GetName() +
                "\" cannot be told (candidates: " + quoted_list(names) +
                "); give them as a variable of the dimension's own name");
}

Eigen::ArrayXd read_coordinate(const GdalGrid& grid, const Array& array) {
    Eigen::ArrayXd values = grid.read_all(array);
    const Decoding decoding = decoding_of(array);
    values = values * decoding.scale + decoding.offset;
    for (Eigen::Index k = 0; k < values.size(); ++k)
        if (!std::isfinite(values(k)) || std::abs(values(k)) > 1e30)
            grid.refuse("the coordinate \"" + array->GetName() + "\" is missing at index " +
                        std::to_string(k) + "; a coordinate may not have missing values");
    return values;
}

Eigen::ArrayXd read_times(const GdalGrid& grid, const Array& array,
                          const campaign::Record& record) {
    TimeUnits units;
    try {
        units = read_time_units(unit_of(array), text_of(array, "calendar"));
    } catch (const DataError& error) {
        grid.refuse("\"" + array->GetName() + "\": " + error.what());
    }
    const std::string& zone = record.time_zone;
    if (!units.zone_said && zone != "Etc/UTC" && zone != "UTC" && zone != "Etc/GMT")
        grid.refuse("the units of \"" + array->GetName() + "\" (" + unit_of(array) +
                    ") carry no offset, which the CF conventions read as UTC, but "
                    "record.time_zone says " +
                    zone + "; write the offset into the units or take out record.time_zone");
    Eigen::ArrayXd times_s = read_coordinate(grid, array);
    for (double& t : times_s)
        t = units.to_utc_s(t);
    return times_s;
}

Eigen::ArrayXd read_distances(const GdalGrid& grid, const Array& array,
                              const campaign::Record& record) {
    const std::string unit = unit_of(array);
    DistanceUnit meant = record.distance_unit;
    if (!unit.empty() && unit != "1") {
        const auto known = distance_unit_of(unit);
        if (!known)
            grid.refuse("the unit of \"" + array->GetName() + "\" is \"" + unit +
                        "\"; fibre distances are in m, km or ft");
        if (record.distance_unit_said && *known != record.distance_unit)
            grid.refuse("the unit of \"" + array->GetName() + "\" is \"" + unit +
                        "\", but record.distance_unit says \"" + word(record.distance_unit) +
                        "\"; take one of them out");
        meant = *known;
    }
    Eigen::ArrayXd distance_m = read_coordinate(grid, array);
    for (double& d : distance_m)
        d = record::to_metres(d, meant);
    const Eigen::Index n = distance_m.size();
    if (n == 0)
        grid.refuse("has no channel along \"" + array->GetName() + "\"");
    const bool falls = n > 1 && distance_m(1) < distance_m(0);
    for (Eigen::Index k = 1; k < n; ++k)
        if (!(falls ? distance_m(k) < distance_m(k - 1) : distance_m(k) > distance_m(k - 1)))
            grid.refuse("\"" + array->GetName() + "\" does not " + (falls ? "fall" : "increase") +
                        " at index " + std::to_string(k) + " (" + text::number(distance_m(k - 1)) +
                        " m, then " + text::number(distance_m(k)) +
                        " m); fibre distances must all differ and be in order");
    return distance_m;
}

} // namespace

Array find_variable(const GdalGrid& grid, const std::string& name, const std::string& key) {
    Array found = grid.find(name);
    if (found && is_numeric(found))
        return found;
    if (found)
        grid.refuse("the variable \"" + name + "\" is not of plain numbers");
    std::vector<std::string> two;
    for (const auto& other : grid.names()) {
        const Array array = grid.find(other);
        if (array && array->GetDimensionCount() == 2 && is_numeric(array))
            two.push_back(other);
    }
    grid.refuse("has no variable \"" + name + "\"; with two dimensions there are " +
                quoted_list(two) + " (say " + key + ")");
}

GridAxes read_axes(const GdalGrid& grid, const Array& variable, const campaign::Record& record) {
    const auto& dimensions = variable->GetDimensions();
    if (dimensions.size() != 2) {
        std::vector<std::string> names;
        for (const auto& dimension : dimensions)
            names.push_back(dimension->GetName());
        grid.refuse("the variable \"" + variable->GetName() + "\" has the dimensions " +
                    quoted_list(names) + "; it needs two, time and distance");
    }
    const std::array<Array, 2> times{time_along(grid, dimensions[0]),
                                     time_along(grid, dimensions[1])};
    if (static_cast<bool>(times[0]) == static_cast<bool>(times[1]))
        grid.refuse("of the dimensions " + dimensions[0]->GetName() + " and " +
                    dimensions[1]->GetName() + " of \"" + variable->GetName() + "\" " +
                    (times[0] ? "both have" : "none has") +
                    " a variable with units like \"seconds since 1970-01-01T00:00:00Z\"; exactly "
                    "one must be time");
    GridAxes axes;
    axes.time_first = static_cast<bool>(times[0]);
    axes.time_s = read_times(grid, axes.time_first ? times[0] : times[1], record);
    if (axes.time_s.size() == 0)
        grid.refuse("has no trace");
    const auto& along = dimensions[axes.time_first ? 1 : 0];
    const Array distance = distance_along(grid, along);
    axes.distance_m = read_distances(grid, distance, record);
    return axes;
}

campaign::TemperatureUnit temperature_unit(const GdalGrid& grid, const Array& variable,
                                           const campaign::Record& record) {
    const std::string unit = unit_of(variable);
    const auto known = temperature_unit_of(unit);
    if (!known) {
        if (!unit.empty() && !record.temperature_unit_said)
            grid.refuse("the unit of \"" + variable->GetName() + "\" is \"" + unit +
                        "\", which is none of degC, K and degF; say record.temperature_unit");
        return record.temperature_unit;
    }
    if (record.temperature_unit_said && *known != record.temperature_unit)
        grid.refuse("the unit of \"" + variable->GetName() + "\" is \"" + unit +
                    "\", but record.temperature_unit says \"" + word(record.temperature_unit) +
                    "\"; take record.temperature_unit out or correct the file");
    return *known;
}

} // namespace rillstrand::store

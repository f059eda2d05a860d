// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// Position of a column by its name: as it stands; else without regard to capitals, blanks around
/// and a unit in brackets (`Temperature [degC]`); else with a known unit as its ending
/// (`distance_m`).
/// @param unit  the unit in lower case, empty where the name carries none
std::optional<std::size_t> find_column(const std::vector<std::string>& header,
                                       const std::string& name, std::string& unit);

std::optional<campaign::TemperatureUnit> temperature_unit_of(const std::string& unit);
std::optional<campaign::DistanceUnit> distance_unit_of(const std::string& unit);

/// Whether a cell reads as a number with a decimal comma, such as `12,5`.
bool looks_decimal_comma(std::string_view cell);

/// `'time', 'distance', 'temperature'`: the first dozen names.
std::string listed(const std::vector<std::string>& header);

} // namespace rillstrand::record

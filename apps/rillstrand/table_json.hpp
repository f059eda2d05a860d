// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "base/table.hpp"

#include <nlohmann/json.hpp>

namespace rillstrand::app {

/// JSON that keeps the order in which its keys were set.
using Json = nlohmann::ordered_json;

/// A number, or null where it is NaN or infinite (neither is JSON).
Json number_json(double value);

/// The rows of a table as a list of objects: null where missing, times as ISO 8601 texts.
/// @param without  columns to leave out
Json rows_json(const Table& table, const std::vector<std::string>& without = {});

Json warnings_json(const Warnings& warnings);

/// The text of a JSON file. Bytes that are not UTF-8 are replaced by U+FFFD.
std::string json_text(const Json& json);

} // namespace rillstrand::app

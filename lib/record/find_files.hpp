// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <filesystem>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// Whether a file's name fits a pattern: `*` any run, `?` any one character, `[a-c]` one of these,
/// `[!a-c]` none of these.
bool matches(std::string_view name, std::string_view pattern);

/// Files that fit the patterns of a list, sorted by name, each once. A pattern is relative to
/// `folder`, whose own name is never taken for a pattern; folders fit only where they are named in
/// full or are Zarr stores.
/// @throws DataError naming each pattern that matches nothing
std::vector<std::filesystem::path> find_files(const std::vector<std::string>& patterns,
                                              const std::filesystem::path& folder);

} // namespace rillstrand::record

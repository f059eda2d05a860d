// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <filesystem>
#include <string>
#include <vector>

namespace rillstrand::campaign {

/// What lies in a folder, as far as names and first lines tell.
struct FolderFacts {
    std::vector<std::string> record_patterns; ///< e.g. `traces/*.csv`
    std::string layout;                       ///< empty where it could not be told
    std::string example;                      ///< first line of numbers or header of the record
    std::size_t record_files = 0;
    double first_m = 0.0, last_m = 0.0; ///< distances in the head; equal: not told
    bool zone_said = false;             ///< stamps carry an offset
    bool stamp_in_name = false, stamp_in_header = false;
    std::vector<std::string> tie_points, lines, rasters;
    struct Series {
        std::string file;
        std::vector<std::string> columns;
    };
    std::vector<Series> series;
    std::vector<std::string> unknown;
};

/// Looks at names and the first lines of the files of a folder and of its folders.
/// @throws DataError if there is no such folder
FolderFacts look_into(const std::filesystem::path& folder);

/// A commented campaign file: what was told from the files, what could not be told, and what is
/// still to be said (marked `# say:`).
std::string draft_campaign(const FolderFacts& facts);

} // namespace rillstrand::campaign

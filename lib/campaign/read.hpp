// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

namespace rillstrand::campaign {

/// Reads and checks a campaign file. Every key of the contract is known; types, ranges, words,
/// references between parts and the files that are named are checked.
/// @throws DataError with all problems at once, each with file, line and column
Campaign read_campaign(const std::filesystem::path& file);

/// The same from text, for a file that lies (or would lie) in a folder.
Campaign parse_campaign(const std::string& toml_text, const std::filesystem::path& file);

} // namespace rillstrand::campaign

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <string>
#include <vector>

namespace rillstrand::app {

/// The customary cautions for what a campaign does, most dangerous first, one paragraph each. They
/// are common practice of the trade unless a source stands in the sentence; local rules and
/// licensed practice come before them.
std::vector<std::string> cautions_for(const campaign::Campaign& campaign);

} // namespace rillstrand::app

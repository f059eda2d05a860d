// SPDX-License-Identifier: Apache-2.0
#include "campaign/campaign.hpp"

namespace rillstrand::campaign {

const Stretch* Campaign::find_stretch(const std::string& stretch_name) const {
    for (const auto& stretch : stretches)
        if (stretch.name == stretch_name)
            return &stretch;
    return nullptr;
}

std::string Campaign::place(Where where) const {
    return file.filename().string() + ":" + std::to_string(where.line) + ":" +
           std::to_string(where.column);
}

} // namespace rillstrand::campaign

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/progress.hpp"
#include "campaign/campaign.hpp"
#include "record/gather.hpp"

#include <filesystem>
#include <string>

namespace rillstrand::store {

using record::GatherReport;
using record::Inspection;

/// Reads the heads of the record's files only, whatever their layout.
/// @throws DataError with all problems of all files
Inspection inspect(const campaign::Campaign& campaign);

/// Gathers the record of a campaign, whatever its layout, into the canonical store.
/// @param record_nc  a temporary name beside the final one; also the place of temporary files
/// @param history    CF `history` of the file
/// @throws DataError naming file and line or index; MachineError if the store cannot be written
GatherReport gather(const campaign::Campaign& campaign, const std::filesystem::path& record_nc,
                    const std::string& history, Progress& progress);

} // namespace rillstrand::store

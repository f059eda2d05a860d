// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/reader.hpp"

namespace rillstrand::campaign {

/// Each reads one part of the file into the campaign.
void read_record(TableReader& root, Campaign& campaign);
void read_stretches(TableReader& root, Campaign& campaign);
void read_placement(TableReader& root, Campaign& campaign);
void read_marks(TableReader& root, Campaign& campaign);
void read_streams(TableReader& root, Campaign& campaign);
void read_snows(TableReader& root, Campaign& campaign);
void read_columns(TableReader& root, Campaign& campaign);
void read_beds(TableReader& root, Campaign& campaign);

/// What can only be told when all parts are there: overlaps, names, references.
void check_together(const Campaign& campaign, Reading& reading);

} // namespace rillstrand::campaign

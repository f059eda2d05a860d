// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "session.hpp"
#include "table_json.hpp"

#include "base/table.hpp"

#include <ostream>
#include <string>
#include <vector>

namespace rillstrand::app {

/// Tables of formats.md, all [[snow]] of the campaign one after the other.
Table snow_channels_table(const Session& session); ///< without positions
Table snow_daily_table(const Session& session);
Table snow_cover_table(const Session& session);
/// Covered share by classes of elevation, slope and aspect; no rows where no elevation is given.
Table snow_classes_table(const Session& session);

/// A value a channel of the record, NaN outside the snow stretches, to be painted along the cable.
struct SnowRaster {
    std::string title, unit, file;
    std::vector<double> value;
};
/// Mean probability of snow and melt-out; none where no stretch looked for snow.
std::vector<SnowRaster> snow_rasters(const Session& session);

/// The block `snow` of the findings.
Json snow_json(const Session& session);

/// What the page draws: probabilities as a picture of day by channel.
Json snow_page_json(const Session& session);

/// Results in short.
void tell_snow(const Session& session, std::ostream& out);

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"
#include "record/head_lines.hpp"
#include "record/source.hpp"
#include "record/stamps.hpp"

#include <filesystem>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

namespace rillstrand::record {

/// Most distances of a record: beyond this the columns are not what they are taken for.
inline constexpr std::size_t most_distances = 1000000;

/// What the head of one text file says: how its rows are to be read.
struct TextHead {
    std::filesystem::path file;
    campaign::Layout layout = campaign::Layout::told_from_file;
    char delimiter = ',';
    char decimal = '.';
    campaign::TemperatureUnit temperature_unit = campaign::TemperatureUnit::degC;
    campaign::DistanceUnit distance_unit = campaign::DistanceUnit::metre;
    std::size_t first_data_line = 1; ///< number of the first line with numbers
    std::size_t cells = 0;           ///< in each row
    std::size_t time_cell = 0;
    std::size_t time_cells = 1; ///< more than one where blanks part the cells and stand in a stamp
    std::size_t distance_cell = 0;
    std::size_t temperature_cell = 0;
    std::vector<std::pair<Quantity, std::size_t>> power_cells;
    std::vector<double> distance_m; ///< wide: increasing
    bool reversed = false;          ///< wide: distances fall; columns are turned round
    std::string stamp;              ///< single: as it stands; wide, tall: of the first row
    ClockStamp clock;               ///< single: the same, read
};

/// Reads the head of a file (its first lines only) and tells what is safe to tell.
/// @throws DataError with file and line where the layout cannot be told or contradicts the campaign
TextHead read_head(const std::filesystem::path& file, const campaign::Record& record,
                   const StampReader& stamps);

/// The stamp of a row that is split into cells.
std::string_view stamp_of(const TextHead& head, const std::vector<std::string_view>& cells);

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"
#include "record/source.hpp"

#include <array>
#include <filesystem>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

namespace rillstrand::record {

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
    std::size_t distance_cell = 0;
    std::size_t temperature_cell = 0;
    std::vector<std::pair<Quantity, std::size_t>> power_cells;
    std::vector<double> distance_m; ///< wide: of the cells in order, without the time cell
    bool reversed = false;          ///< wide: distances fall; columns are turned round
    std::string stamp;              ///< single: the text of the stamp
    std::string stamp_format;       ///< single: empty: the campaign's, or ISO 8601
    std::string first_stamp;        ///< wide, tall: of the first row
};

/// Reads the head of a file (its first lines only) and tells what is safe to tell.
/// @throws DataError with file and line where the layout cannot be told or contradicts the campaign
TextHead read_head(const std::filesystem::path& file, const campaign::Record& record);

/// Whether a line carries no data: blank or a comment.
bool is_comment(std::string_view line, const campaign::RecordText& options);

} // namespace rillstrand::record

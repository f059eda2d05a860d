// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// What became of the cells of a record.
struct CellCounts {
    std::int64_t values = 0;       ///< finite temperatures that were kept
    std::int64_t missing = 0;      ///< empty, or a word or number for 'missing'
    std::int64_t out_of_range = 0; ///< outside valid_range_c, set missing
    double out_of_range_sum = 0.0; ///< of the values as they stood in the file
    void add(const CellCounts& other);
};

/// Turns cells into numbers in the record's unit, whatever the locale.
class CellReader {
public:
    CellReader(const campaign::Record& record, campaign::TemperatureUnit temperature_unit,
               char decimal);

    /// A number as it stands, NaN where the cell says 'missing'.
    /// @return false if it is neither
    bool number(std::string_view cell, double& value) const;
    /// A temperature in degC, NaN where missing or outside the valid range.
    /// @return false if it is neither a number nor a word for 'missing'
    bool temperature(std::string_view cell, float& value_degC, CellCounts& counts) const;
    /// The same from a number as it stands in the file.
    float temperature(double value, CellCounts& counts) const;
    char decimal() const { return m_decimal; }
    /// NaN where a number of the file stands for 'missing', else the number.
    double seen(double value) const;

private:
    bool is_missing(double value) const;
    bool number_or_word(std::string_view cell, double& value) const;
    campaign::TemperatureUnit m_unit;
    char m_decimal;
    std::vector<std::string> m_missing_words;
    std::vector<double> m_missing_numbers;
    double m_low_degC, m_high_degC;
};

/// @throws DataError if more than half of the numbers of a record lie outside its valid range: the
///         unit that was said is not the unit of the file
void refuse_wrong_unit(const CellCounts& counts, const campaign::Record& record,
                       const std::string& what);

double to_metres(double distance, campaign::DistanceUnit unit);

} // namespace rillstrand::record

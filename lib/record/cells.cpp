// SPDX-License-Identifier: Apache-2.0
#include "record/cells.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "record/decimal.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <limits>

namespace rillstrand::record {

namespace {

constexpr double zero_degC_K = 273.15;

double to_degC(double value, campaign::TemperatureUnit unit) {
    switch (unit) {
    case campaign::TemperatureUnit::degC:
        return value;
    case campaign::TemperatureUnit::kelvin:
        return value - zero_degC_K;
    case campaign::TemperatureUnit::degF:
        return (value - 32.0) / 1.8;
    }
    return value;
}

} // namespace

void CellCounts::add(const CellCounts& other) {
    values += other.values;
    missing += other.missing;
    out_of_range += other.out_of_range;
    out_of_range_sum += other.out_of_range_sum;
}

CellReader::CellReader(const campaign::Record& record, campaign::TemperatureUnit temperature_unit,
                       char decimal)
    : m_unit{temperature_unit}, m_decimal{decimal}, m_low_degC{record.valid_range_c[0]},
      m_high_degC{record.valid_range_c[1]} {
    for (const auto& word : record.missing) {
        m_missing_words.push_back(word);
        if (const auto value = text::parse_number(word))
            m_missing_numbers.push_back(*value);
    }
    m_missing_words.emplace_back("NaN"); // the same word as nan, as most programs write it
}

bool CellReader::is_missing(double value) const {
    return std::find(m_missing_numbers.begin(), m_missing_numbers.end(), value) !=
           m_missing_numbers.end();
}

bool CellReader::number(std::string_view cell, double& value) const {
    const char* begin = cell.data();
    const char* const end = begin + cell.size();
    if (take_decimal(begin, end, m_decimal, value) && begin == end) {
        if (is_missing(value))
            value = std::numeric_limits<double>::quiet_NaN();
        return true;
    }
    return number_or_word(cell, value);
}

bool CellReader::number_or_word(std::string_view cell, double& value) const {
    const char* begin = cell.data();
    const char* end = begin + cell.size();
    std::array<char, 64> copy{};
    // A point is no part of a number with a decimal comma: `1.234,5` is refused, not guessed.
    const bool foreign = m_decimal == ',' && cell.find('.') != std::string_view::npos;
    if (m_decimal == ',' && cell.size() < copy.size()) {
        std::copy(begin, end, copy.begin());
        std::replace(copy.begin(), copy.begin() + static_cast<std::ptrdiff_t>(cell.size()), ',',
                     '.');
        begin = copy.data();
        end = begin + cell.size();
    }
    if (end - begin > 1 && *begin == '+' && begin[1] != '-')
        ++begin;
    const auto result = std::from_chars(begin, end, value);
    if (result.ec == std::errc{} && result.ptr == end && std::isfinite(value) && !foreign) {
        if (is_missing(value))
            value = std::numeric_limits<double>::quiet_NaN();
        return true;
    }
    value = std::numeric_limits<double>::quiet_NaN();
    return std::find(m_missing_words.begin(), m_missing_words.end(), cell) != m_missing_words.end();
}

double CellReader::seen(double value) const {
    return is_missing(value) ? std::numeric_limits<double>::quiet_NaN() : value;
}

float CellReader::temperature(double value, CellCounts& counts) const {
    if (!std::isfinite(value) || is_missing(value)) {
        ++counts.missing;
        return std::numeric_limits<float>::quiet_NaN();
    }
    const double degC = to_degC(value, m_unit);
    if (degC < m_low_degC || degC > m_high_degC) {
        ++counts.out_of_range;
        counts.out_of_range_sum += value;
        return std::numeric_limits<float>::quiet_NaN();
    }
    ++counts.values;
    return static_cast<float>(degC);
}

bool CellReader::temperature(std::string_view cell, float& value_degC, CellCounts& counts) const {
    double value = 0.0;
    if (!number(cell, value))
        return false;
    value_degC = temperature(value, counts);
    return true;
}

void refuse_wrong_unit(const CellCounts& counts, const campaign::Record& record,
                       const std::string& what) {
    if (counts.out_of_range <= counts.values)
        return;
    const double mean = counts.out_of_range_sum / static_cast<double>(counts.out_of_range);
    std::string hint = "correct record.temperature_unit or record.valid_range_c";
    // Temperatures of waters, grounds and airs: 200 to 400 is nothing but kelvin.
    if (record.temperature_unit != campaign::TemperatureUnit::kelvin && mean > 200.0 &&
        mean < 400.0)
        hint = "they look like kelvin: set record.temperature_unit = \"K\"";
    else if (record.temperature_unit == campaign::TemperatureUnit::kelvin && mean > -60.0 &&
             mean < 150.0)
        hint = mean < 32.0 ? "they look like degrees Celsius: set record.temperature_unit = "
                             "\"degC\""
                           : "they are no kelvin: set record.temperature_unit to \"degC\" or "
                             "\"degF\"";
    throw DataError{what + ": " + std::to_string(counts.out_of_range) + " of " +
                    std::to_string(counts.out_of_range + counts.values) +
                    " temperatures lie outside " + text::number(record.valid_range_c[0]) + " to " +
                    text::number(record.valid_range_c[1]) + " degC (their mean is " +
                    text::fixed(mean, 1) + " as written); " + hint};
}

double to_metres(double distance, campaign::DistanceUnit unit) {
    switch (unit) {
    case campaign::DistanceUnit::metre:
        return distance;
    case campaign::DistanceUnit::kilometre:
        return distance * 1000.0;
    case campaign::DistanceUnit::foot:
        return distance * 0.3048;
    }
    return distance;
}

} // namespace rillstrand::record

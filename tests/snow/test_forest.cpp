// SPDX-License-Identifier: Apache-2.0
// Real soil temperatures under a forest floor with depths measured by hand; data/SOURCE.txt.
#include "snow/snow.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <fstream>
#include <limits>
#include <map>
#include <sstream>

using namespace rillstrand;

namespace {

const std::string folder = std::string{RILLSTRAND_TEST_DATA} + "/data/";
constexpr double day_s = 86400.0;

/// UTC of `YYYY-MM-DD`, by the civil calendar (days from 1970-01-01).
double date_s(const std::string& text) {
    int y = std::stoi(text.substr(0, 4));
    const int m = std::stoi(text.substr(5, 2)), d = std::stoi(text.substr(8, 2));
    y -= m <= 2 ? 1 : 0;
    const int era = y / 400, of_era = y - era * 400;
    const int of_year = (153 * (m + (m > 2 ? -3 : 9)) + 2) / 5 + d - 1;
    return (era * 146097.0 + of_era * 365.0 + of_era / 4 - of_era / 100 + of_year - 719468.0) *
           day_s;
}

struct Soil {
    std::vector<double> time_s, soil_degC, air_degC;
};

Soil read_soil(double from_s, double to_s) {
    std::ifstream file{folder + "forest_soil.csv"};
    Soil soil;
    std::string line;
    while (std::getline(file, line)) {
        if (line.empty() || line[0] == '#' || line[0] == 't')
            continue;
        std::stringstream cells{line};
        std::string time, value, air;
        std::getline(cells, time, ',');
        std::getline(cells, value, ',');
        std::getline(cells, air, ',');
        const double at = date_s(time) + 3600.0 * (std::stod(time.substr(11)) + 5.0);
        if (at < from_s || at >= to_s)
            continue;
        const double nan = std::numeric_limits<double>::quiet_NaN();
        soil.time_s.push_back(at);
        soil.soil_degC.push_back(value.empty() ? nan : std::stod(value));
        soil.air_degC.push_back(air.empty() ? nan : std::stod(air));
    }
    return soil;
}

/// Days on which snow is known: measured, or between two measurements that agree.
std::map<std::string, bool> known_days() {
    std::ifstream file{folder + "forest_depth.csv"};
    std::map<std::string, bool> known;
    std::string line, last;
    while (std::getline(file, line)) {
        if (line.empty() || line[0] == '#' || line[0] == 'd')
            continue;
        const std::string date = line.substr(0, 10);
        known[date] = std::stod(line.substr(11)) > 0.0;
        last = date;
    }
    return known;
}

struct Tally {
    double snow = 0, snow_right = 0, bare = 0, bare_right = 0, brier = 0;
    double balanced() const { return 0.5 * (snow_right / snow + bare_right / bare); }
};

Tally season(double from_s, double to_s, bool with_air) {
    const Soil soil = read_soil(from_s, to_s);
    const auto n = static_cast<Eigen::Index>(soil.time_s.size());
    snow::SnowInput input;
    input.time_s = Eigen::Map<const Eigen::ArrayXd>(soil.time_s.data(), n);
    input.bin_s = 7200.0;
    input.fibre_m = Eigen::ArrayXd::Constant(1, 0.0);
    input.temperature_degC =
        Eigen::Map<const Eigen::ArrayXd>(soil.soil_degC.data(), n).cast<float>();
    input.burial_depth_m = 0.05;
    input.config.stretch = "forest floor";
    input.config.utc_offset_h = -5.0;
    if (with_air)
        input.air_degC =
            snow::Series{input.time_s, Eigen::Map<const Eigen::ArrayXd>(soil.air_degC.data(), n)};
    const auto f = snow::interpret(input);
    const auto known = known_days();
    Tally tally;
    for (Eigen::Index d = 0; d < f.days.n_day(); ++d) {
        const std::string& date = f.days.date[static_cast<std::size_t>(d)];
        const auto next = known.lower_bound(date);
        bool snow = false;
        if (next != known.end() && next->first == date)
            snow = next->second;
        else if (next != known.end() && next != known.begin() &&
                 date_s(next->first) - date_s(std::prev(next)->first) < 60.0 * day_s) {
            if (next->second != std::prev(next)->second)
                continue;
            snow = next->second;
        } else if (next == known.begin() || std::prev(next)->second) {
            continue;
        } // else: the warm half of the year after a last measurement of nothing
        const double p = f.probability(d, 0), error = p - (snow ? 1.0 : 0.0);
        tally.brier += error * error;
        (snow ? tally.snow : tally.bare) += 1.0;
        if ((p > 0.5) == snow)
            (snow ? tally.snow_right : tally.bare_right) += 1.0;
    }
    tally.brier /= tally.snow + tally.bare;
    return tally;
}

} // namespace

// The first soil stands near 0 degC under snow, in the second winter near +1.2 degC; in November of
// the second, thin snow lies on soil of 4 degC, which no method tells from its temperature.
TEST_CASE("two winters under a forest floor, each by itself", "[snow][published]") {
    const bool with_air = GENERATE(false, true);
    const Tally first = season(date_s("2018-11-20"), date_s("2019-09-01"), with_air);
    CHECK(first.balanced() >= 0.93);
    CHECK(first.brier <= 0.09);
    const Tally second = season(date_s("2019-09-01"), date_s("2020-08-01"), with_air);
    CHECK(second.balanced() >= 0.9);
    CHECK(second.brier <= 0.09);
}

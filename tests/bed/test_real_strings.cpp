// SPDX-License-Identifier: Apache-2.0
#include "bed/bed.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <cstdlib>
#include <fstream>
#include <limits>
#include <sstream>
#include <string>
#include <vector>

using namespace rillstrand;

namespace {

/// A string of thermometers: column names are depths in metres, straight down from the surface.
bed::BedInput read_string(const std::string& file, double interval_s) {
    std::ifstream in{std::string{RILLSTRAND_TEST_DATA} + "/data/" + file};
    REQUIRE(in.good());
    std::string line, cell;
    std::getline(in, line);
    std::vector<double> depth_m;
    std::istringstream head{line};
    std::getline(head, cell, ',');
    while (std::getline(head, cell, ','))
        depth_m.push_back(std::strtod(cell.c_str(), nullptr));
    std::vector<std::vector<double>> rows;
    while (std::getline(in, line)) {
        std::istringstream cells{line + ","};
        std::vector<double> row;
        while (std::getline(cells, cell, ','))
            row.push_back(cell.empty() ? std::numeric_limits<double>::quiet_NaN()
                                       : std::strtod(cell.c_str(), nullptr));
        row.resize(depth_m.size() + 1, std::numeric_limits<double>::quiet_NaN());
        rows.push_back(row);
    }
    bed::BedInput input;
    input.interval_s = interval_s;
    input.config.name = "string";
    input.config.stretch = "string";
    const auto n = static_cast<Eigen::Index>(rows.size());
    const auto m = static_cast<Eigen::Index>(depth_m.size());
    input.fibre_m = Eigen::Map<const Eigen::ArrayXd>(depth_m.data(), m);
    input.time_s.resize(n);
    input.temperature_degC.resize(n, m);
    for (Eigen::Index i = 0; i < n; ++i) {
        const auto& row = rows[static_cast<std::size_t>(i)];
        input.time_s(i) = row[0];
        for (Eigen::Index j = 0; j < m; ++j)
            input.temperature_degC(i, j) = row[static_cast<std::size_t>(j + 1)];
    }
    return input;
}

} // namespace

// Sources and licences: data/SOURCE.txt. Nothing flows through these, or hardly anything: soil
// above the water table, and ice.
TEST_CASE("strings of conduction alone have no flux", "[bed][published]") {
    struct Site {
        const char* file;
        double interval_s, conductivity, capacity, porosity;
    };
    // Moist loam and clay of Moene & van Dam (2014), table 2.2; forest soil as measured there by
    // others, 5 to 7e-7 m2/s; ice 2.2 W/m/K and 1.9e6 J/m3/K near 0 degC.
    const Site site = GENERATE(values<Site>({{"bedford.csv", 86400.0, 1.5, 2.4e6, 0.4},
                                             {"manhattan.csv", 86400.0, 1.3, 2.6e6, 0.4},
                                             {"old_town.csv", 3600.0, 1.0, 2.0e6, 0.5},
                                             {"rikha_samba.csv", 21600.0, 2.1, 1.9e6, 0.0}}));
    CAPTURE(site.file);
    bed::BedInput input = read_string(site.file, site.interval_s);
    input.config.thermal_conductivity_wmk = site.conductivity;
    input.config.heat_capacity_jm3k = site.capacity;
    input.config.porosity = site.porosity;
    const bed::BedFindings found = bed::interpret(input);
    REQUIRE(std::isfinite(found.mean_flux_m_s));
    CHECK(std::abs(found.mean_flux_m_s) < 2.0 * found.mean_flux_sd_m_s);
}

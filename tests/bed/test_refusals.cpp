// SPDX-License-Identifier: Apache-2.0
#include "simulator.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <limits>

using namespace rillstrand;
using Catch::Matchers::Contains;

namespace {

beds::SimulatedBed some_bed(beds::Nature nature = {}) {
    std::mt19937_64 random{11};
    nature.days = std::min(nature.days, 6.0);
    nature.sample_m = 0.5;
    return beds::simulate(nature, random);
}

bool warned(const bed::BedFindings& found, const std::string& code) {
    return std::any_of(found.warnings.begin(), found.warnings.end(),
                       [&](const Warning& w) { return w.code == code; });
}

/// Only the columns that a test keeps.
void keep(bed::BedInput& input, const std::vector<Eigen::Index>& columns) {
    const bed::BedInput all = input;
    const auto n = static_cast<Eigen::Index>(columns.size());
    input.fibre_m.resize(n);
    input.temperature_degC.resize(all.time_s.size(), n);
    for (Eigen::Index j = 0; j < n; ++j) {
        input.fibre_m(j) = all.fibre_m(columns[static_cast<std::size_t>(j)]);
        input.temperature_degC.col(j) =
            all.temperature_degC.col(columns[static_cast<std::size_t>(j)]);
    }
}

} // namespace

TEST_CASE("a rod out of the bed is refused by name", "[bed][property]") {
    bed::BedInput input = some_bed().input;
    input.config.datum_fibre_m = 1000.0;
    CHECK_THROWS_WITH(bed::interpret(input), Contains("[[bed]] 'rod'") && Contains("two depths") &&
                                                 Contains("datum_fibre_m"));
}

TEST_CASE("a short record is refused by name", "[bed][property]") {
    bed::BedInput input = some_bed().input;
    input.time_s = Eigen::ArrayXd(input.time_s.head(40));
    input.temperature_degC = Eigen::ArrayXXd(input.temperature_degC.topRows(40));
    CHECK_THROWS_WITH(bed::interpret(input), Contains("a day and a half"));
}

TEST_CASE("two depths give the daily wave's flux, and say so", "[bed][property]") {
    beds::Nature nature;
    nature.floods = 0;
    nature.base_flux_m_d = 0.5;
    const beds::SimulatedBed bed = some_bed(nature);
    bed::BedInput input = bed.input;
    std::vector<Eigen::Index> in_bed;
    for (Eigen::Index j = 0; j < input.fibre_m.size(); ++j)
        if (input.fibre_m(j) > input.config.datum_fibre_m + 1.0)
            in_bed.push_back(j);
    keep(input, {in_bed[0], in_bed[4]});
    const bed::BedFindings found = bed::interpret(input);
    CHECK(warned(found, "bed-few-depths"));
    CHECK(found.method == "joint");
    REQUIRE(std::isfinite(found.mean_flux_m_s));
    CHECK(found.mean_flux_m_s * 86400.0 > 0.2);
    CHECK(found.mean_flux_m_s * 86400.0 < 0.8);
    // Size only, never a sign.
    for (const bed::FluxRow& row : found.methods)
        if (row.method == "phase" && std::isfinite(row.flux_m_s))
            CHECK(row.flux_m_s >= 0.0);
}

TEST_CASE("wrong winding and wrong properties are named", "[bed][property]") {
    bed::BedInput input = some_bed().input;
    input.config.winding->pitch_m *= 1.35;
    CHECK(warned(bed::interpret(input), "bed-spacing"));
    input = some_bed().input;
    input.config.thermal_conductivity_wmk = 12.0;
    CHECK(warned(bed::interpret(input), "bed-diffusivity"));
    input = some_bed().input;
    input.config.heat_capacity_jm3k = 1.2e6;
    CHECK(warned(bed::interpret(input), "bed-capacity"));
}

TEST_CASE("water that comes up fast leaves no wave below", "[bed][property]") {
    beds::Nature nature;
    nature.base_flux_m_d = -2.0;
    nature.daily_K = 0.5;
    const bed::BedFindings found = bed::interpret(some_bed(nature).input);
    CHECK(warned(found, "bed-deep-amplitude"));
}

TEST_CASE("a flood marks the windows of the daily wave", "[bed][property]") {
    beds::Nature nature;
    nature.flood_m_d = 1.5;
    nature.base_flux_m_d = 0.1;
    const bed::BedFindings found = bed::interpret(some_bed(nature).input);
    CHECK(warned(found, "bed-unsteady"));
}

TEST_CASE("gaps and dead channels leave a flux", "[bed][property]") {
    beds::Nature nature;
    nature.floods = 0;
    const beds::SimulatedBed bed = some_bed(nature);
    bed::BedInput input = bed.input;
    const double nan = std::numeric_limits<double>::quiet_NaN();
    input.temperature_degC.col(6).setConstant(nan);
    input.temperature_degC.middleRows(140, 20).setConstant(nan);
    for (Eigen::Index i = 0; i < input.temperature_degC.size(); i += 17)
        input.temperature_degC.data()[i] = nan;
    const bed::BedFindings found = bed::interpret(input);
    CHECK(found.method == "fit");
    const double truth = bed.mean_flux_m_s(input.time_s(0), input.time_s(input.time_s.size() - 1));
    CHECK(std::abs(found.mean_flux_m_s - truth) < 0.1 / 86400.0);
}

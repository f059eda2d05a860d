// SPDX-License-Identifier: Apache-2.0
// The column's figures against simulated lakes whose truth is known.
#include "lake.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <cstdlib>
#include <iostream>

using namespace rillstrand;

namespace {

/// Errors of one figure against its truth.
struct Errors {
    double n = 0.0, square = 0.0, inside = 0.0, claimed_wrongly = 0.0, missed = 0.0, sd = 0.0;
    void add(double value, double sd_value, double truth) {
        if (std::isnan(value) && std::isnan(truth))
            return;
        if (std::isnan(truth)) {
            claimed_wrongly += 1.0;
            return;
        }
        if (std::isnan(value)) {
            missed += 1.0;
            return;
        }
        n += 1.0;
        square += (value - truth) * (value - truth);
        sd += sd_value;
        inside += std::abs(value - truth) <= 2.0 * sd_value ? 1.0 : 0.0;
    }
    double rms() const { return std::sqrt(square / n); }
    double covered() const { return inside / n; }
};

struct Scores {
    Errors thermocline, mixed_layer, stability, heat;
    double hours = 0.0, none = 0.0;
    double stability_off = 0.0, heat_off = 0.0;
};

Scores score(const simulated::Lake& lake, const simulated::Cable& cable, int seeds, double days) {
    Scores s;
    for (int seed = 1; seed <= seeds; ++seed) {
        std::mt19937_64 random{static_cast<std::uint64_t>(1000 + seed)};
        const auto input = simulated::observe(lake, cable, days, random);
        const auto found = column::interpret(input);
        const double below = column::depths_below_datum_m(input.fibre_m, input.config).maxCoeff();
        for (std::size_t i = 0; i < found.series.size(); ++i) {
            const auto& state = found.series[i];
            const double bottom_m = below + input.level_m(static_cast<Eigen::Index>(i)) - 400.0;
            const auto truth = simulated::true_profile(lake, state.time_s, bottom_m);
            const auto layers = column::Hypsograph::constant(bottom_m);
            const auto t = column::thermocline(truth, lake.ice);
            s.thermocline.add(state.thermocline_depth_m, state.thermocline_depth_sd_m, t.depth_m);
            s.mixed_layer.add(state.mixed_layer_depth_m, state.mixed_layer_depth_sd_m,
                              column::mixed_layer_depth_m(truth));
            const double stability = column::schmidt_stability_J_m2(truth, layers),
                         heat = column::heat_content_J_m2(truth, layers);
            s.stability.add(state.schmidt_stability_jm2, state.schmidt_stability_sd_jm2, stability);
            s.heat.add(state.heat_content_jm2, state.heat_content_sd_jm2, heat);
            s.stability_off += state.schmidt_stability_jm2 / stability - 1.0;
            s.heat_off += state.heat_content_jm2 / heat - 1.0;
            s.hours += 1.0;
            s.none += std::isnan(state.thermocline_depth_m) ? 1.0 : 0.0;
        }
    }
    if (std::getenv("RILLSTRAND_TALK") != nullptr) {
        const auto tell = [](const char* name, const Errors& e) {
            std::cout << "  " << name << " n " << e.n << " rms " << e.rms() << " inside "
                      << e.covered() << " mean sd " << e.sd / e.n << " wrongly "
                      << e.claimed_wrongly << " missed " << e.missed << '\n';
        };
        tell("thermocline", s.thermocline);
        tell("mixed layer", s.mixed_layer);
        tell("stability", s.stability);
        tell("heat", s.heat);
        std::cout << "  stability off " << s.stability_off / s.hours << " heat off "
                  << s.heat_off / s.hours << " none " << s.none / s.hours << '\n';
    }
    return s;
}

} // namespace

TEST_CASE("a summer lake with a seiche, on a hanging cable", "[column][property]") {
    simulated::Lake lake;
    lake.wave_m = 1.0;
    lake.day_warming_K = 0.4;
    lake.level_change_m = 0.2;
    const Scores s = score(lake, {}, 2, 2.0);
    CHECK(s.thermocline.rms() < 0.15);
    CHECK(s.thermocline.missed == 0.0);
    CHECK(s.thermocline.covered() > 0.9);
    CHECK(s.mixed_layer.rms() < 0.15);
    CHECK(std::abs(s.stability_off / s.hours) < 0.01);
    CHECK(std::abs(s.heat_off / s.hours) < 0.003);
}

TEST_CASE("a sharp thermocline on a wound mast", "[column][property]") {
    simulated::Lake lake;
    lake.depth_m = 10.0;
    lake.front_m = 4.0;
    lake.front_sd_m = 0.25;
    lake.wave_m = 0.4;
    simulated::Cable cable;
    cable.winding = campaign::Winding{0.11, 0.02};
    cable.above_m = 0.6;
    const Scores s = score(lake, cable, 1, 2.0);
    CHECK(s.thermocline.rms() < 0.07);
    CHECK(s.thermocline.covered() > 0.9);
    CHECK(s.mixed_layer.rms() < 0.15);
}

TEST_CASE("water under ice", "[column][property]") {
    simulated::Lake lake;
    lake.ice = true;
    lake.air_degC = -6.0;
    lake.front_sd_m = 1.6;
    const Scores s = score(lake, {}, 2, 1.0);
    CHECK(s.thermocline.rms() < 0.15);
    CHECK(s.thermocline.covered() > 0.9);
}

TEST_CASE("mixed water has no thermocline", "[column][property]") {
    simulated::Lake lake;
    lake.mixed = true;
    const double temperature = GENERATE(4.5, 9.0, 18.0);
    lake.bottom_degC = temperature;
    const Scores s = score(lake, {}, 1, 1.5);
    CHECK(s.none >= 0.95 * s.hours);
}

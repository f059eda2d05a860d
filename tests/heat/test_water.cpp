// SPDX-License-Identifier: Apache-2.0
#include "heat/water.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;

namespace {

Celsius at(double t_degC) {
    return Celsius::from_degC(t_degC);
}

} // namespace

// D-01 to D-08. Tanaka et al. (2001), Metrologia 38, 301-309, doi:10.1088/0026-1394/38/4/3; EOS-80:
// Fofonoff and Millard (1983); Chen and Millero (1986), Limnol. Oceanogr. 31, 657-662. The last
// column is TEOS-10 (Debian's python3-gsw, rho_t_exact(0, t, 0)).
TEST_CASE("densities of fresh water match their tables", "[heat][published]") {
    struct Row {
        double t, tanaka, eos80, chen_millero, teos10;
    };
    const auto row = GENERATE(Row{0, 999.842826, 999.842594, 999.839500, 999.843071},
                              Row{4, 999.974948, 999.974958, 999.971918, 999.974873},
                              Row{5, 999.966783, 999.966732, 999.963781, 999.966648},
                              Row{10, 999.702702, 999.701870, 999.699673, 999.702482},
                              Row{15, 999.102572, 999.101032, 999.099565, 999.102606},
                              Row{20, 998.206746, 998.205329, 998.204050, 998.207146},
                              Row{25, 997.047022, 997.046420, 997.044862, 997.047649},
                              Row{30, 995.648797, 995.648960, 995.647248, 995.649458});
    const double last_printed_digit = 1e-6;
    CHECK_THAT(heat::density_tanaka_kg_m3(at(row.t)), WithinAbs(row.tanaka, last_printed_digit));
    CHECK_THAT(heat::density_eos80_kg_m3(at(row.t), 0.0, 0.0),
               WithinAbs(row.eos80, last_printed_digit));
    CHECK_THAT(heat::density_chen_millero_kg_m3(at(row.t), 0.0, 0.0),
               WithinAbs(row.chen_millero, last_printed_digit));
    CHECK_THAT(heat::density_tanaka_kg_m3(at(row.t)), WithinAbs(row.teos10, 8e-4));
    CHECK_THAT(row.eos80, WithinAbs(heat::density_tanaka_kg_m3(at(row.t)), 2e-3));
    CHECK_THAT(row.chen_millero, WithinAbs(heat::density_tanaka_kg_m3(at(row.t)), 4e-3));
}

// D-10 to D-14: maxima of the densities, and the formula of Chen and Millero (1986).
TEST_CASE("water is densest near four degrees", "[heat][published]") {
    const auto densest = [](const auto& density) {
        double best = 0.0, where = 0.0;
        for (double t = 3.5; t < 4.5; t += 1e-4)
            if (density(t) > best) {
                best = density(t);
                where = t;
            }
        return where;
    };
    const double step = 2e-4;
    CHECK_THAT(densest([](double t) { return heat::density_tanaka_kg_m3(at(t)); }),
               WithinAbs(3.9830, step));
    CHECK_THAT(heat::density_tanaka_kg_m3(at(3.983035)), WithinAbs(999.974950, 1e-9));
    CHECK_THAT(densest([](double t) { return heat::density_eos80_kg_m3(at(t), 0.0, 0.0); }),
               WithinAbs(3.9817 / 1.00024, step));
    CHECK_THAT(densest([](double t) { return heat::density_chen_millero_kg_m3(at(t), 0.0, 0.0); }),
               WithinAbs(3.9854, step));
    CHECK_THAT(heat::density_chen_millero_kg_m3(at(3.9854), 0.0, 0.0), WithinAbs(999.97192, 1e-5));
    CHECK_THAT(heat::densest_degC(0.0, 10.0), WithinAbs(3.7842, 1e-4));
    CHECK_THAT(heat::densest_degC(0.5, 0.0), WithinAbs(3.8730, 1e-4));
}

// D-20 to D-28. Fofonoff and Millard (1983), Unesco Technical Papers in Marine Science 44, p. 19;
// temperatures on the scale of 1968.
TEST_CASE("EOS-80 matches its check values", "[heat][published]") {
    struct Row {
        double s, t68, p, rho, k;
    };
    const auto row =
        GENERATE(Row{0, 5, 0, 999.96675, 20337.80375}, Row{0, 5, 1000, 1044.12802, 23643.52599},
                 Row{0, 25, 0, 997.04796, 22100.72106}, Row{0, 25, 1000, 1037.90204, 25405.09717},
                 Row{35, 5, 0, 1027.67547, 22185.93358}, Row{35, 5, 1000, 1069.48914, 25577.49819},
                 Row{35, 25, 0, 1023.34306, 23726.34949},
                 Row{35, 25, 1000, 1062.53817, 27108.94504}, Row{40, 40, 1000, 1059.82037, 0});
    const Celsius t = at(row.t68 / 1.00024);
    const double last_printed_digit = 1e-5;
    CHECK_THAT(heat::density_eos80_kg_m3(t, row.s, row.p), WithinAbs(row.rho, last_printed_digit));
    if (row.k > 0)
        CHECK_THAT(heat::bulk_modulus_eos80_bar(t, row.s, row.p),
                   WithinAbs(row.k, last_printed_digit));
}

// D-30 to D-33: Chen and Millero (1986), recomputed from the paper's formula.
TEST_CASE("density in the limnological range", "[heat][published]") {
    struct Row {
        double s, t, p, rho;
    };
    const auto row = GENERATE(Row{0.5, 10, 0, 1000.091953}, Row{0.6, 20, 0, 998.660614},
                              Row{0, 4, 10, 1000.466184}, Row{0.5, 30, 18, 996.821181});
    CHECK_THAT(heat::density_chen_millero_kg_m3(at(row.t), row.s, row.p), WithinAbs(row.rho, 1e-6));
}

TEST_CASE("the lake's density takes the formula that fits its salt", "[heat][property]") {
    const double seam_kg_m3 = 0.01;
    for (const double t : {0.0, 4.0, 12.0, 25.0}) {
        CHECK(heat::lake_density_kg_m3(at(t), 0.0) == heat::density_tanaka_kg_m3(at(t)));
        CHECK_THAT(heat::lake_density_kg_m3(at(t), 0.5999),
                   WithinAbs(heat::lake_density_kg_m3(at(t), 0.6001), seam_kg_m3));
        CHECK(heat::lake_density_kg_m3(at(t), 8.0) > heat::lake_density_kg_m3(at(t), 0.6) + 5.0);
    }
}

// H-01 to H-03, H-05, H-08. TEOS-10 (Debian's python3-gsw: cp_t_exact, rho_t_exact, alpha); latent
// heat: FAO, after Harrison (1963). H-08, older handbook figures: from memory.
TEST_CASE("heat constants of water", "[heat][published]") {
    struct Row {
        double t, cp;
    };
    for (const auto& row : {Row{0, 4219.4}, Row{5, 4205.1}, Row{10, 4195.1}, Row{15, 4188.5},
                            Row{20, 4184.1}, Row{25, 4181.3}, Row{30, 4179.8}})
        CHECK_THAT(heat::heat_capacity_J_kgK(at(row.t)), WithinAbs(row.cp, 0.06));
    for (const auto& row : {Row{0, 4.2187}, Row{10, 4.1939}, Row{20, 4.1766}, Row{30, 4.1616}})
        CHECK_THAT(1e-6 * heat::heat_capacity_J_kgK(at(row.t)) *
                       heat::density_tanaka_kg_m3(at(row.t)),
                   WithinAbs(row.cp, 1e-4));
    for (const auto& row : {Row{0, 4217.6}, Row{10, 4192.1}, Row{20, 4181.8}, Row{30, 4178.4}})
        CHECK_THAT(heat::heat_capacity_J_kgK(at(row.t)), WithinRel(row.cp, 8e-4));
    struct Expansion {
        double t, alpha;
    };
    // Two densities' slopes differ by a few parts in ten million per kelvin.
    for (const auto& row : {Expansion{0, -6.774e-5}, Expansion{4, 3.37e-7}, Expansion{10, 8.794e-5},
                            Expansion{20, 2.0680e-4}, Expansion{25, 2.5729e-4}})
        CHECK_THAT(heat::thermal_expansion_1_K(at(row.t)), WithinAbs(row.alpha, 6e-7));
    CHECK_THAT(heat::latent_heat_vaporisation_J_kg(at(20.0)), WithinAbs(2.45378e6, 10.0));
    // H-04, TEOS-10: 2.45107 MJ/kg at 20 degC; the linear formula lies 0.11 % above.
    CHECK_THAT(heat::latent_heat_vaporisation_J_kg(at(20.0)), WithinRel(1.0011 * 2.45107e6, 1e-4));
    CHECK_THAT(heat::latent_heat_fusion_J_kg, WithinRel(333427.0, 1e-9));
}

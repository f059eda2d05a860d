// SPDX-License-Identifier: Apache-2.0
#include "scenarios.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <numbers>
#include <random>

using namespace rillstrand;
using namespace rillstrand::stream;

namespace {

/// Steady mixing of a cascade at every time, with the instrument's noise: 100 L/s, then +10 at
/// 9 degC, +15 at 9 degC, +5 at 9 degC.
StreamInput cascade(double noise_K, double offset_K, unsigned seed) {
    StreamInput in;
    in.config.stretch = "reach";
    in.config.inflow_temperature_c = 9.0 + offset_K;
    in.config.inflow_temperature_sd_c = 0.0;
    in.config.discharge_m3s = 0.100;
    in.config.discharge_sd_m3s = 0.001;
    const Eigen::Index n = 96, m = 800;
    in.interval_s = 1800.0;
    in.time_s = Eigen::ArrayXd::LinSpaced(n, 0.5, double(n) - 0.5) * 1800.0;
    in.fibre_m = Eigen::ArrayXd::LinSpaced(m, 100.0, 100.0 + 0.5 * double(m - 1));
    in.temperature_degC.resize(n, m);
    std::mt19937_64 random(seed);
    std::normal_distribution<double> normal;
    for (Eigen::Index i = 0; i < n; ++i) {
        const double head = 17.0 + 3.0 * std::cos(in.time_s[i] * std::numbers::pi / 43200.0);
        const double a = (100.0 * head + 10.0 * 9.0) / 110.0;
        const double b = (110.0 * a + 15.0 * 9.0) / 125.0;
        const double c = (125.0 * b + 5.0 * 9.0) / 130.0;
        for (Eigen::Index j = 0; j < m; ++j) {
            const double x = in.fibre_m[j];
            const double water = x < 200.1 ? head : x < 300.1 ? a : x < 400.1 ? b : c;
            in.temperature_degC(i, j) = water + offset_K + noise_K * normal(random);
        }
    }
    in.spatial_response_m = 0.3;
    return in;
}

void check_cascade(const StreamFindings& f) {
    REQUIRE(f.inflows.size() == 3);
    // shares of the flow below each by mass balance: 10/110, 15/125, 5/130
    const double share[] = {10.0 / 110.0, 15.0 / 125.0, 5.0 / 130.0};
    const double place[] = {200.25, 300.25, 400.25}; // half-way between the channels of a jump
    const double litres[] = {10.0, 15.0, 5.0};
    for (std::size_t k = 0; k < 3; ++k) {
        CHECK(f.inflows[k].kind == Kind::step);
        CHECK(std::abs(f.inflows[k].fraction - share[k]) < 4.0 * f.inflows[k].fraction_sd);
        CHECK(f.inflows[k].fraction_sd < 0.003);
        CHECK(f.inflows[k].fibre_m == Approx(place[k]).margin(0.5));
        CHECK(std::abs(1e3 * f.inflows[k].discharge_m3s - litres[k]) <
              4e3 * f.inflows[k].discharge_sd_m3s);
    }
}

} // namespace

TEST_CASE("three inflows in turn come out by mass balance", "[stream]") {
    check_cascade(interpret(cascade(0.03, 0.0, 3)));
}

TEST_CASE("an offset common to stream and inflow changes nothing", "[stream][property]") {
    const StreamFindings plain = interpret(cascade(0.03, 0.0, 5));
    const StreamFindings warm = interpret(cascade(0.03, 0.7, 5));
    REQUIRE(plain.inflows.size() == warm.inflows.size());
    for (std::size_t k = 0; k < plain.inflows.size(); ++k)
        CHECK(plain.inflows[k].fraction == Approx(warm.inflows[k].fraction).epsilon(1e-4));
}

TEST_CASE("the inflow temperature is told from the record where it is not given", "[stream]") {
    StreamInput in = cascade(0.03, 0.0, 7);
    in.config.inflow_temperature_c.reset();
    const StreamFindings f = interpret(in);
    for (const Inflow& i : f.inflows)
        UNSCOPED_INFO(to_string(i.kind) << " at " << i.fibre_from_m << "-" << i.fibre_to_m
                                        << " share " << i.fraction << " z " << i.score);
    check_cascade(f);
    CHECK(std::abs(f.inflow_temperature_c - 9.0) < 4.0 * f.inflow_temperature_sd_c);
    CHECK(f.inflow_temperature_sd_c < 0.3);
    CHECK_FALSE(f.inflow_temperature_given);
}

TEST_CASE("an inflow temperature that does not fit the record is reported", "[stream]") {
    StreamInput in = cascade(0.03, 0.0, 9);
    in.config.inflow_temperature_c = 12.0;
    in.config.inflow_temperature_sd_c = 0.1;
    const StreamFindings f = interpret(in);
    for (const Inflow& i : f.inflows)
        UNSCOPED_INFO(to_string(i.kind) << " at " << i.fibre_from_m << "-" << i.fibre_to_m
                                        << " share " << i.fraction << " z " << i.score);
    bool said = false;
    for (const std::string& caution : f.cautions)
        said = said || caution.find("does not fit the record") != std::string::npos;
    CHECK(said);
}

TEST_CASE("the direction of the fibre does not matter", "[stream][property]") {
    const StreamInput in = cascade(0.03, 0.0, 11);
    StreamInput back = in;
    back.config.flow = campaign::Flow::decreasing;
    back.temperature_degC = in.temperature_degC.rowwise().reverse();
    const double ends = in.fibre_m[0] + in.fibre_m[in.fibre_m.size() - 1];
    const StreamFindings a = interpret(in), b = interpret(back);
    REQUIRE(a.inflows.size() == b.inflows.size());
    for (std::size_t k = 0; k < a.inflows.size(); ++k) { // both in the order of the water
        CHECK(a.inflows[k].fraction == Approx(b.inflows[k].fraction).epsilon(1e-6));
        CHECK(a.inflows[k].fibre_m == Approx(ends - b.inflows[k].fibre_m).margin(1e-4));
    }
}

TEST_CASE("a loss that is constant in time is no inflow", "[stream]") {
    StreamInput in = cascade(0.03, 0.0, 13);
    const Eigen::ArrayXd head = in.temperature_degC.leftCols(150).rowwise().mean();
    std::mt19937_64 random(1);
    std::normal_distribution<double> normal;
    for (Eigen::Index j = 0; j < in.fibre_m.size(); ++j)
        for (Eigen::Index i = 0; i < in.time_s.size(); ++i)
            in.temperature_degC(i, j) =
                head[i] + (in.fibre_m[j] > 250.0 ? -0.2 : 0.0) + 0.03 * normal(random);
    const StreamFindings f = interpret(in);
    for (const Inflow& i : f.inflows)
        UNSCOPED_INFO(to_string(i.kind) << " at " << i.fibre_from_m << "-" << i.fibre_to_m
                                        << " share " << i.fraction << " z " << i.score);
    CHECK(f.inflows.empty());
    for (const Artefact& artefact : f.artefacts) { // unseen where constants are shut out anyway
        CHECK(artefact.kind == "step loss");
        CHECK(artefact.size_c == Approx(-0.2).margin(0.02));
    }
    CHECK(std::isfinite(f.detection_limit_median)); // 'nothing found' comes with what could be seen
}

TEST_CASE("two arms too alike give no share", "[stream]") {
    StreamInput in = cascade(0.03, 0.0, 15);
    const Eigen::ArrayXd head = in.temperature_degC.leftCols(150).rowwise().mean();
    in.known.push_back({"mill outlet", 200.0, Series{in.time_s, head}});
    const StreamFindings f = interpret(in);
    for (const Inflow& i : f.inflows)
        UNSCOPED_INFO(to_string(i.kind) << " at " << i.fibre_from_m << "-" << i.fibre_to_m
                                        << " share " << i.fraction << " z " << i.score);
    bool seen = false;
    for (const Inflow& i : f.inflows)
        if (i.known) {
            seen = true;
            CHECK(i.label == "mill outlet");
            CHECK(std::isnan(i.fraction));
        }
    CHECK(seen);
}

TEST_CASE("no contrast gives no number", "[stream]") {
    StreamInput in = cascade(0.03, 0.0, 17);
    std::mt19937_64 random(2);
    std::normal_distribution<double> normal;
    in.temperature_degC = Eigen::ArrayXXd::NullaryExpr(
        in.time_s.size(), in.fibre_m.size(),
        [&](Eigen::Index, Eigen::Index) { return 9.0 + 0.03 * normal(random); });
    const StreamFindings f = interpret(in);
    for (const Inflow& i : f.inflows)
        UNSCOPED_INFO(to_string(i.kind) << " at " << i.fibre_from_m << "-" << i.fibre_to_m
                                        << " share " << i.fraction << " z " << i.score);
    CHECK(f.inflows.empty());
    CHECK_FALSE(f.detection_limit_median < 0.02);
}

TEST_CASE("what cannot be used is said in words", "[stream]") {
    StreamInput in = cascade(0.03, 0.0, 19);
    SECTION("too few channels") {
        in.fibre_m.conservativeResize(5);
        in.temperature_degC = in.temperature_degC.leftCols(5).eval();
        CHECK_THROWS_WITH(interpret(in), Catch::Matchers::Contains("only 5 channels are usable"));
    }
    SECTION("too few times") {
        in.temperature_degC.bottomRows(in.time_s.size() - 2)
            .setConstant(std::numeric_limits<double>::quiet_NaN());
        CHECK_THROWS_AS(interpret(in), DataError);
    }
    SECTION("holes and excluded pieces are no hindrance") {
        for (Eigen::Index i = 0; i < in.time_s.size(); i += 7)
            in.temperature_degC(i, 3 * i) = std::numeric_limits<double>::quiet_NaN();
        in.temperature_degC.middleRows(20, 6).setConstant(std::numeric_limits<double>::quiet_NaN());
        in.excluded.push_back({240.0, 246.0, "coil"});
        check_cascade(interpret(in));
    }
}

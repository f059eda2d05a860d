// SPDX-License-Identifier: Apache-2.0
#include "bed/march.hpp"

#include "bed/fit.hpp"
#include "heat/vertical_flow.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <random>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

namespace {

constexpr double omega = 6.283185307179586 / 86400.0;
const heat::Ground sand{1.8, 2.8e6};

/// Stallman's wave of 3 K between 0.05 and 0.45 m, half-hourly for some days.
bed::Profile wave(double flux_m_d, double days) {
    const heat::WaveNumbers n = heat::wave_numbers(
        heat::diffusivity_m2_s(sand),
        heat::front_velocity_m_s(flux_m_d / 86400.0, sand.heat_capacity_J_m3_K), 86400.0);
    const auto at = [&](double t, double z) {
        return 12.0 + 3.0 * std::exp(-n.decay_per_m * z) * std::cos(omega * t - n.turn_rad_m * z);
    };
    bed::Profile p;
    p.step_s = 1800.0;
    p.top_m = 0.05;
    p.bottom_m = 0.45;
    p.depth_m = Eigen::ArrayXd::LinSpaced(7, 0.10, 0.40);
    const auto rows = static_cast<Eigen::Index>(days * 48.0);
    p.time_s = 1800.0 * Eigen::ArrayXd::LinSpaced(rows, 0.0, static_cast<double>(rows - 1));
    p.top_degC.resize(rows);
    p.bottom_degC.resize(rows);
    p.observed_degC.resize(rows, 7);
    for (Eigen::Index i = 0; i < rows; ++i) {
        p.top_degC(i) = at(p.time_s(i), p.top_m);
        p.bottom_degC(i) = at(p.time_s(i), p.bottom_m);
        for (Eigen::Index j = 0; j < 7; ++j)
            p.observed_degC(i, j) = at(p.time_s(i), p.depth_m(j));
    }
    p.segments = {{0, rows}};
    return p;
}

bed::Layout layout_of(const bed::Profile& p) {
    bed::Layout l;
    l.n_layer = 3;
    l.n_place = p.depth_m.size();
    l.n_start = 5;
    l.n_segment = 1;
    l.knot_s = 10800.0;
    l.n_knot = static_cast<Eigen::Index>(p.time_s(p.time_s.size() - 1) / l.knot_s) + 2;
    l.n_kernel = p.averaging_m > 0.0 ? 2 : 0;
    return l;
}

} // namespace

// Stallman (1965), J. Geophys. Res. 70, 2821-2827.
TEST_CASE("the march follows the closed form of a daily wave", "[bed][published]") {
    const double flux_m_d = GENERATE(-1.0, -0.3, 0.0, 0.5, 2.0);
    CAPTURE(flux_m_d);
    const bed::Profile p = wave(flux_m_d, 4.0);
    const bed::Layout l = layout_of(p);
    const bed::March march{p, l, 1.8, 2.8e6};
    Eigen::VectorXd unknowns = Eigen::VectorXd::Zero(l.size());
    unknowns.segment(l.flux(), l.n_knot).setConstant(flux_m_d / 0.1);
    const bed::Normal n = march.pass(unknowns, Eigen::ArrayXd::Ones(7), true);
    const double grid_and_step_K = 0.012; // of a wave of 3 K
    CHECK(n.residual_K.bottomRows(100).abs().maxCoeff() < grid_and_step_K);
}

TEST_CASE("sensitivities are the slopes of the march", "[bed][property]") {
    bed::Profile p = wave(0.4, 2.0);
    const bool blurred = GENERATE(false, true);
    p.averaging_m = blurred ? 0.06 : 0.0;
    const bed::Layout l = layout_of(p);
    const bed::March march{p, l, 1.8, 2.8e6};
    std::mt19937_64 random{5};
    std::normal_distribution<double> normal;
    Eigen::VectorXd at = Eigen::VectorXd::Zero(l.size());
    for (double& v : at)
        v = 0.02 * normal(random);
    at.segment(l.flux(), l.n_knot).array() += 4.0;
    const Eigen::ArrayXd weight = Eigen::ArrayXd::Ones(7);
    const bed::Normal n = march.pass(at, weight, false);
    // The gradient of half the misfit is minus the sum of J r.
    const double step = 1e-4;
    for (const Eigen::Index k :
         {l.conductivity(), l.conductivity() + 2, l.capacity(), l.capacity() + 1, l.offsets() + 3,
          l.starts() + 2, l.flux() + 3, l.flux() + 9, l.top() + 5, l.bottom() + 4}) {
        CAPTURE(k, blurred);
        Eigen::VectorXd up = at, down = at;
        up(k) += step;
        down(k) -= step;
        const double slope =
            (march.pass(down, weight, true).misfit - march.pass(up, weight, true).misfit) /
            (4.0 * step);
        CHECK_THAT(n.gradient(k), WithinAbs(slope, 2e-4 * (1.0 + std::abs(slope))));
    }
}

TEST_CASE("the fit finds the flux of a closed form", "[bed][published]") {
    const double flux_m_d = GENERATE(-0.5, 0.0, 0.5);
    CAPTURE(flux_m_d);
    bed::FitInput in;
    in.profile = wave(flux_m_d, 6.0);
    in.noise_K = Eigen::ArrayXd::Constant(7, 0.01);
    in.boundary_noise_K = 0.01;
    const bed::FitResult f = bed::fit_profile(in);
    const bed::FitResult::Mean q = f.mean(86400.0, 5.0 * 86400.0, 0.0);
    const double grid_m_d = 0.005;
    CHECK_THAT(86400.0 * q.flux_m_s, WithinAbs(flux_m_d, grid_m_d));
    CHECK_THAT(1e7 * f.diffusivity_m2_s, WithinAbs(6.428571, 0.08));
}

// SPDX-License-Identifier: Apache-2.0
#include "scenarios.hpp"

#include <algorithm>
#include <cmath>
#include <cstdio>

namespace rillstrand::stream::scenarios {

namespace {

using Random = std::mt19937_64;
using physics::Patch;

double draw(Random& random, double low, double high) {
    return std::uniform_real_distribution<double>(low, high)(random);
}

double draw_log(Random& random, double low, double high) {
    return std::exp(draw(random, std::log(low), std::log(high)));
}

void add_shade(physics::Stream& stream, Random& random) {
    for (double x = draw(random, 0.0, 120.0); x < stream.length_m; x += draw(random, 80.0, 260.0))
        stream.lights.push_back({x, x + draw(random, 20.0, 120.0), draw(random, 0.1, 0.95)});
}

void add_inflows(physics::Stream& stream, Random& random, double low, double high, double apart_low,
                 double apart_high, double temperature_degC) {
    double q = stream.discharge_m3s;
    for (double x = draw(random, 50.0, 90.0); x < stream.length_m - 40.0;
         x += draw(random, apart_low, apart_high)) {
        const double f = draw_log(random, low, high);
        physics::PointInflow inflow;
        inflow.label = "inflow";
        inflow.stream_m = x;
        inflow.discharge_m3s = q * f / (1.0 - f);
        inflow.temperature_degC = temperature_degC;
        if (draw(random, 0.0, 1.0) < 0.6) {
            inflow.mixing_m = draw(random, 1.5, 9.0);
            inflow.bank = draw(random, 0.0, 1.0) < 0.5 ? -1.0 : draw(random, 0.2, 1.2);
        }
        q += inflow.discharge_m3s;
        stream.inflows.push_back(inflow);
    }
}

void add_patches(physics::Cable& cable, Random& random, double length_m) {
    const double part = length_m / 5.0;
    int k = 0;
    for (const auto kind :
         {Patch::Kind::sunlit, Patch::Kind::dry, Patch::Kind::buried, Patch::Kind::pool}) {
        Patch patch;
        patch.kind = kind;
        patch.from_m = (0.3 + k++) * part + draw(random, 0.0, 0.5 * part);
        patch.to_m = patch.from_m + draw(random, 4.0, 25.0);
        switch (kind) {
        case Patch::Kind::sunlit:
            patch.strength = draw(random, 0.3, 2.0);
            break;
        case Patch::Kind::dry:
            patch.strength = draw(random, 0.2, 0.9);
            break;
        case Patch::Kind::buried:
            patch.strength = draw(random, 3.0, 12.0);
            break;
        default:
            patch.strength = draw(random, 0.5, 3.0);
        }
        cable.patches.push_back(patch);
    }
}

void add_spots(physics::Cable& cable, const physics::Stream& stream, Random& random,
               double temperature_degC) {
    for (double x = 40.0; x < stream.length_m - 30.0; x += draw(random, 150.0, 250.0)) {
        const double at = x;
        const bool free = std::none_of(
            stream.inflows.begin(), stream.inflows.end(),
            [&](const physics::PointInflow& i) { return std::abs(i.stream_m - at) < 12.0; });
        if (free)
            cable.patches.push_back({Patch::Kind::spot, x, x + draw(random, 0.6, 3.0),
                                     draw(random, 0.08, 0.4), temperature_degC});
    }
}

void set_winter(physics::Stream& stream) {
    stream.declination_deg = -20.0;
    stream.air_mean_degC = -3.0;
    stream.air_amplitude_K = 4.0;
    stream.source_degC = 3.0;
    stream.source_hours = 10.0;
    stream.weather_K = 2.5;
}

} // namespace

Campaign make(Sort sort, unsigned seed, bool with_inflows) {
    Random random(1000003ULL * seed + 17ULL * static_cast<unsigned>(sort));
    Campaign c;
    c.length_m = sort == Sort::small ? 300.0 : 1000.0;
    double days = 3.0, groundwater = draw(random, 8.5, 11.0);
    physics::Stream& s = c.stream;
    physics::Cable& k = c.cable;
    s.length_m = c.length_m;
    s.discharge_m3s = draw_log(random, 0.02, 0.1);
    s.air_mean_degC = draw(random, 15.0, 20.0);
    s.cloud_mean = draw(random, 0.1, 0.7);
    s.light = draw(random, 0.3, 0.8);
    s.width_m = draw(random, 1.2, 2.2);
    k.interval_s = 900.0;
    k.noise_K = draw(random, 0.04, 0.09);
    k.response_m = draw(random, 0.8, 1.6);
    add_shade(s, random);
    switch (sort) {
    case Sort::plain:
        add_inflows(s, random, 0.01, 0.15, 80.0, 200.0, groundwater);
        break;
    case Sort::nothing:
        add_patches(k, random, c.length_m);
        if (seed % 2 == 0)
            k.losses.push_back({draw(random, 100.0, 900.0), draw(random, -0.3, 0.3)});
        break;
    case Sort::hard: {
        s.air_mean_degC = draw(random, 10.0, 13.0);
        s.source_degC = 10.0;
        groundwater = draw(random, 10.5, 12.5);
        s.light = draw(random, 0.5, 0.9);
        add_inflows(s, random, 0.02, 0.15, 120.0, 250.0, groundwater);
        physics::PointInflow arm;
        arm.label = "mill arm";
        arm.surface_water = true;
        arm.stream_m = 0.5 * c.length_m;
        for (const physics::PointInflow& i : s.inflows)
            if (std::abs(i.stream_m - arm.stream_m) < 25.0)
                arm.stream_m = i.stream_m + 40.0;
        arm.discharge_m3s = 0.15 * s.discharge_m3s;
        arm.temperature_degC = s.air_mean_degC + 3.0;
        arm.daily_amplitude_K = 2.5;
        s.inflows.push_back(arm);
        k.against = true;
        k.gaps_h = {{20.0, 27.0}};
        k.dead = {{700.0, 720.0}};
        break;
    }
    case Sort::many:
        days = 10.0;
        k.interval_s = 1800.0;
        add_inflows(s, random, 0.003, 0.02, 70.0, 140.0, groundwater);
        add_spots(k, s, random, groundwater);
        for (const double from : {210.0, 640.0})
            s.gains.push_back({from, from + draw(random, 80.0, 160.0),
                               draw(random, 0.04, 0.10) * s.discharge_m3s, groundwater});
        break;
    case Sort::winter:
        set_winter(s);
        add_inflows(s, random, 0.01, 0.12, 80.0, 200.0, groundwater);
        break;
    case Sort::small:
        days = 2.0;
        k.interval_s = 1800.0;
        k.sampling_m = 1.0;
        if (with_inflows) {
            add_inflows(s, random, 0.015, 0.12, 90.0, 160.0, groundwater);
        } else {
            add_patches(k, random, c.length_m);
        }
        break;
    }
    c.truth = physics::simulate(s, k, 2051222400.0, days, random); // midnight UTC, 1 January 2035
    StreamInput& in = c.input;
    in.config.stretch = "reach";
    in.time_s = c.truth.time_s;
    in.interval_s = k.interval_s;
    in.fibre_m = c.truth.fibre_m;
    in.temperature_degC = c.truth.temperature_degC.cast<double>();
    in.spatial_response_m = 1.088450 * k.response_m; // 10-90 of a Gaussian by its full width
    in.config.flow = k.against ? campaign::Flow::decreasing : campaign::Flow::increasing;
    in.config.discharge_m3s =
        s.discharge_m3s * (1.0 + 0.03 * std::normal_distribution<double>()(random));
    in.config.discharge_sd_m3s = 0.03 * s.discharge_m3s;
    if (sort != Sort::hard) {
        const double error_K = sort == Sort::plain ? 0.0 : 0.1; // the bound takes it as it is
        in.config.inflow_temperature_c =
            groundwater + error_K * std::normal_distribution<double>()(random);
        in.config.inflow_temperature_sd_c = error_K;
    }
    for (const physics::TrueInflow& t : c.truth.inflows)
        if (t.inflow.surface_water)
            in.known.push_back(
                {t.inflow.label, t.fibre_m + 1.5, Series{c.truth.time_s, t.series_degC}});
    return c;
}

double bound(const Campaign& c, const physics::TrueInflow& t) {
    const double mixing = t.inflow.bank != 0.0 ? 3.0 * t.inflow.mixing_m : 0.0;
    const double edge = c.cable.response_m;
    const double sign = c.cable.against ? -1.0 : 1.0;
    double s0 = 0.0, s1 = 0.0, s2 = 0.0, h0 = 0.0, h1 = 0.0;
    double noise2 = 0.0, n = 0.0;
    Eigen::Index above = 0;
    for (Eigen::Index j = 0; j < c.truth.fibre_m.size(); ++j) {
        const double x = (c.truth.fibre_m[j] - t.fibre_m) * sign;
        const bool up = x < -edge && x > -60.0, down = x > edge + mixing && x < 60.0;
        if (!up && !down)
            continue;
        s0 += 1.0;
        s1 += x;
        s2 += x * x;
        if (down) {
            h0 += 1.0;
            h1 += x;
        } else {
            above = j;
        }
        const double sd =
            c.cable.noise_K * (1.0 + c.cable.noise_growth_per_km * c.truth.fibre_m[j] / 1000.0);
        noise2 += sd * sd;
        n += 1.0;
    }
    const double det = s0 * s2 - s1 * s1;
    const double left = h0 - (h0 * (s2 * h0 - s1 * h1) + h1 * (s0 * h1 - s1 * h0)) / det;
    double power = 0.0;
    for (Eigen::Index i = 0; i < c.truth.time_s.size(); ++i) {
        double water = 0.0, m = 0.0;
        for (Eigen::Index j = std::max<Eigen::Index>(0, above - 10);
             j < std::min(c.truth.fibre_m.size(), above + 10); ++j)
            if (std::isfinite(c.truth.temperature_degC(i, j))) {
                water += static_cast<double>(c.truth.temperature_degC(i, j));
                m += 1.0;
            }
        if (m > 0.0)
            power += std::pow(t.series_degC[i] - water / m, 2);
    }
    return std::sqrt(noise2 / n / (left * power));
}

namespace {

void score_gains(const Campaign& c, const StreamFindings& f, Tally& tally,
                 std::vector<bool>& used) {
    for (const physics::TrueGain& gain : c.truth.gains) {
        ++tally.gains;
        for (std::size_t i = 0; i < f.inflows.size(); ++i) {
            const Inflow& found = f.inflows[i];
            const double overlap = std::min(found.fibre_to_m, gain.fibre_to_m) -
                                   std::max(found.fibre_from_m, gain.fibre_from_m);
            if (found.kind != Kind::diffuse || used[i] ||
                overlap < 0.4 * (gain.fibre_to_m - gain.fibre_from_m))
                continue;
            used[i] = true;
            ++tally.gains_found;
            tally.gain_shares_in +=
                std::abs(found.fraction - gain.fraction) <= 2.0 * found.fraction_sd ? 1 : 0;
            break;
        }
    }
}

void score_spots(const Campaign& c, const StreamFindings& f, Tally& tally,
                 std::vector<bool>& used) {
    for (const Patch& patch : c.cable.patches) {
        if (patch.kind != Patch::Kind::spot)
            continue;
        ++tally.spots;
        const double at = physics::fibre_at(c.truth, 0.5 * (patch.from_m + patch.to_m));
        for (std::size_t i = 0; i < f.inflows.size(); ++i)
            if (std::abs(f.inflows[i].fibre_m - at) < 4.0 && !used[i]) {
                used[i] = true;
                ++(f.inflows[i].kind == Kind::spot ? tally.spots_found : tally.spots_as_inflow);
                break;
            }
    }
}

/// Nearest finding of an inflow; its index, or the number of findings.
std::size_t partner(const StreamFindings& f, double fibre_m, const std::vector<bool>& used,
                    bool known) {
    std::size_t best = f.inflows.size();
    double nearest = 12.0; // metres
    for (std::size_t i = 0; i < f.inflows.size(); ++i) {
        const double far = std::abs(f.inflows[i].fibre_m - fibre_m);
        if (!used[i] && f.inflows[i].kind == Kind::step && f.inflows[i].known == known &&
            far < nearest) {
            nearest = far;
            best = i;
        }
    }
    return best;
}

} // namespace

void score(const Campaign& c, const StreamFindings& f, Tally& tally, bool talk) {
    std::vector<bool> used(f.inflows.size(), false);
    tally.km += c.length_m / 1000.0;
    ++tally.campaigns;
    score_spots(c, f, tally, used);
    for (const physics::TrueInflow& t : c.truth.inflows) {
        const std::size_t i = partner(f, t.fibre_m, used, t.inflow.surface_water);
        const bool found = i < f.inflows.size();
        if (t.inflow.surface_water) {
            ++tally.tributaries;
            if (found) {
                used[i] = true;
                tally.tributaries_in +=
                    std::abs(f.inflows[i].fraction - t.fraction) <= 2.0 * f.inflows[i].fraction_sd
                        ? 1
                        : 0;
            }
            continue;
        }
        int& all = t.fraction >= 0.03 ? tally.over3 : t.fraction >= 0.01 ? tally.one3 : tally.half1;
        int& got = t.fraction >= 0.03   ? tally.over3_found
                   : t.fraction >= 0.01 ? tally.one3_found
                                        : tally.half1_found;
        if (t.fraction >= 0.005)
            ++all;
        if (!found) {
            Eigen::Index j = 0;
            (f.channels.fibre_m - t.fibre_m).abs().minCoeff(&j);
            ++tally.missed;
            const double limit = f.channels.detection_limit_fraction[j];
            tally.missed_over_limit += t.fraction > limit ? 1 : 0;
            if (talk)
                std::printf("   missed %.1f m share %.4f limit %.4f mixing %.1f bank %.1f\n",
                            t.fibre_m, t.fraction, limit, t.inflow.mixing_m, t.inflow.bank);
            continue;
        }
        used[i] = true;
        const Inflow& in = f.inflows[i];
        if (t.fraction >= 0.005)
            ++got;
        ++tally.shares;
        tally.shares_in += std::abs(in.fraction - t.fraction) <= 2.0 * in.fraction_sd ? 1 : 0;
        tally.share_errors.push_back(std::abs(in.fraction / t.fraction - 1.0));
        tally.bound_ratio2.push_back(std::pow((in.fraction - t.fraction) / bound(c, t), 2));
        ++tally.places;
        tally.place_errors.push_back(std::abs(in.fibre_m - t.fibre_m));
        tally.places_in += std::abs(in.fibre_m - t.fibre_m) <= 2.0 * in.fibre_sd_m ? 1 : 0;
        if (in.temperature_sd_c > 0.0) {
            ++tally.sources;
            tally.source_errors.push_back(std::abs(in.temperature_c - t.temperature_degC));
            tally.sources_in +=
                std::abs(in.temperature_c - t.temperature_degC) <= 2.0 * in.temperature_sd_c ? 1
                                                                                             : 0;
        }
        if (std::isfinite(in.discharge_m3s)) {
            ++tally.flows;
            tally.flows_in +=
                std::abs(in.discharge_m3s - t.inflow.discharge_m3s) <= 2.0 * in.discharge_sd_m3s
                    ? 1
                    : 0;
        }
        if (talk && std::abs(in.fraction - t.fraction) > 2.0 * in.fraction_sd)
            std::printf("   off %.1f m share %.4f +- %.4f true %.4f (%.1f sd) place %.2f +- %.2f "
                        "of %.2f mixing %.1f bank %.1f\n",
                        in.fibre_m, in.fraction, in.fraction_sd, t.fraction,
                        (in.fraction - t.fraction) / in.fraction_sd, in.fibre_m, in.fibre_sd_m,
                        t.fibre_m, t.inflow.mixing_m, t.inflow.bank);
    }
    score_gains(c, f, tally, used);
    int false_ones = 0;
    for (std::size_t i = 0; i < f.inflows.size(); ++i)
        if (!used[i]) {
            ++false_ones;
            if (talk)
                std::printf("   false %s at %.1f-%.1f share %.4f +- %.4f z %.1f: %s\n",
                            to_string(f.inflows[i].kind).c_str(), f.inflows[i].fibre_from_m,
                            f.inflows[i].fibre_to_m, f.inflows[i].fraction,
                            f.inflows[i].fraction_sd, f.inflows[i].score,
                            f.inflows[i].evidence.empty() ? ""
                                                          : f.inflows[i].evidence.back().c_str());
        }
    tally.false_inflows += false_ones;
    tally.campaigns_with_false += false_ones > 0 ? 1 : 0;
}

} // namespace rillstrand::stream::scenarios

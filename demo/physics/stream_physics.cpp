// SPDX-License-Identifier: Apache-2.0
#include "stream_physics.hpp"

#include "cable.hpp"
#include "weather.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace rillstrand::physics {

namespace {

/// What does not change with time, per cell.
struct Cells {
    Eigen::ArrayXd light;     ///< share of the sky
    Eigen::ArrayXd gain_m3s;  ///< what comes in within the cell
    Eigen::ArrayXd gain_heat; ///< constant part: discharge times temperature
    Eigen::ArrayXd below_m3s; ///< discharge out of the cell
    std::vector<Eigen::Index> inflow_cell;
};

Cells make_cells(const Stream& stream) {
    const auto n = static_cast<Eigen::Index>(std::lround(stream.length_m / stream.cell_m));
    Cells cells;
    cells.light = Eigen::ArrayXd::Constant(n, stream.light);
    cells.gain_m3s = Eigen::ArrayXd::Zero(n);
    cells.gain_heat = Eigen::ArrayXd::Zero(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        const double x = (double(i) + 0.5) * stream.cell_m;
        for (const Light& light : stream.lights)
            if (x >= light.from_m && x < light.to_m)
                cells.light[i] = light.share;
        for (const DiffuseGain& gain : stream.gains)
            if (x >= gain.from_m && x < gain.to_m) {
                const double q = gain.discharge_m3s * stream.cell_m / (gain.to_m - gain.from_m);
                cells.gain_m3s[i] += q;
                cells.gain_heat[i] += q * gain.temperature_degC;
            }
    }
    for (const PointInflow& inflow : stream.inflows) {
        const auto cell = std::clamp(static_cast<Eigen::Index>(inflow.stream_m / stream.cell_m),
                                     Eigen::Index{0}, n - 1);
        cells.inflow_cell.push_back(cell);
        cells.gain_m3s[cell] += inflow.discharge_m3s;
    }
    cells.below_m3s.resize(n);
    double q = stream.discharge_m3s;
    for (Eigen::Index i = 0; i < n; ++i)
        cells.below_m3s[i] = q += cells.gain_m3s[i];
    return cells;
}

double inflow_degC(const Stream& stream, const PointInflow& inflow, double time_s) {
    const double hour = solar_hour(stream, time_s);
    return inflow.temperature_degC +
           inflow.daily_amplitude_K * std::cos((hour - inflow.peak_hour) * std::numbers::pi / 12.0);
}

/// One implicit step down the stream: each cell is a mixed box whose inflow, outflow and surface
/// are weighed at the new time, so that it is stable at any step and keeps heat exactly.
void advance(const Stream& stream, const Cells& cells, const Sky& sky, Eigen::Index i_step,
             double time_s, Eigen::ArrayXd& gain_heat, Eigen::ArrayXd& water_degC) {
    gain_heat = cells.gain_heat;
    for (std::size_t k = 0; k < stream.inflows.size(); ++k)
        gain_heat[cells.inflow_cell[k]] +=
            stream.inflows[k].discharge_m3s * inflow_degC(stream, stream.inflows[k], time_s);
    const double area = stream.width_m * stream.cell_m;
    const double hold = area * stream.depth_m / stream.step_s;
    const double exchange = area * stream.exchange_W_m2_K / water_heat_J_m3_K;
    const double air = exchange * sky.air_degC[i_step];
    const double sun =
        area / water_heat_J_m3_K * (0.9 * sky.shortwave_W_m2[i_step] - sky.sky_loss_W_m2[i_step]);
    double above = sky.head_degC[i_step];
    double q = stream.discharge_m3s;
    for (Eigen::Index i = 0; i < water_degC.size(); ++i) {
        const double q_out = cells.below_m3s[i];
        const double heat =
            hold * water_degC[i] + q * above + gain_heat[i] + air + sun * cells.light[i];
        above = std::max(heat / (hold + q_out + exchange), 0.0);
        water_degC[i] = above;
        q = q_out;
    }
}

} // namespace

Record simulate(const Stream& stream, const Cable& cable, double start_s, double days,
                std::mt19937_64& random) {
    const Cells cells = make_cells(stream);
    const auto per_trace = std::max<Eigen::Index>(1, std::lround(cable.interval_s / stream.step_s));
    const auto traces = static_cast<Eigen::Index>(std::floor(days * 86400.0 / cable.interval_s));
    const auto spin_up = static_cast<Eigen::Index>(std::ceil((6.0 * 3600.0) / stream.step_s));
    const double first_s = start_s - double(spin_up) * stream.step_s;
    const Sky sky = make_sky(stream, first_s, spin_up + traces * per_trace, random);

    Looker looker(stream, cable, random);
    Record record = looker.blank(start_s, traces);
    record.upstream_discharge_m3s = stream.discharge_m3s;
    record.downstream_discharge_m3s = cells.below_m3s[cells.below_m3s.size() - 1];
    for (std::size_t k = 0; k < stream.inflows.size(); ++k) {
        TrueInflow truth;
        truth.inflow = stream.inflows[k];
        // what comes in anywhere in a cell is mixed into all of it: it enters at the cell's edge
        truth.inflow.stream_m = double(cells.inflow_cell[k]) * stream.cell_m;
        truth.fibre_m = fibre_at(record, truth.inflow.stream_m);
        truth.fraction = truth.inflow.discharge_m3s / cells.below_m3s[cells.inflow_cell[k]];
        truth.series_degC.resize(traces);
        for (Eigen::Index i = 0; i < traces; ++i)
            truth.series_degC[i] = inflow_degC(stream, truth.inflow, record.time_s[i]);
        truth.temperature_degC = truth.series_degC.mean();
        record.inflows.push_back(truth);
    }
    for (const DiffuseGain& gain : stream.gains) {
        TrueGain truth{gain, fibre_at(record, gain.from_m), fibre_at(record, gain.to_m), 0.0};
        if (truth.fibre_from_m > truth.fibre_to_m)
            std::swap(truth.fibre_from_m, truth.fibre_to_m);
        const auto last = std::clamp(static_cast<Eigen::Index>(gain.to_m / stream.cell_m) - 1,
                                     Eigen::Index{0}, cells.below_m3s.size() - 1);
        truth.fraction = gain.discharge_m3s / cells.below_m3s[last];
        record.gains.push_back(truth);
    }

    Eigen::ArrayXd water = Eigen::ArrayXd::Constant(cells.light.size(), sky.head_degC[0]);
    Eigen::ArrayXd sum = Eigen::ArrayXd::Zero(water.size());
    Eigen::ArrayXd gain_heat;
    for (Eigen::Index i = 0; i < spin_up; ++i)
        advance(stream, cells, sky, i, first_s + double(i) * stream.step_s, gain_heat, water);
    for (Eigen::Index trace = 0; trace < traces; ++trace) {
        sum.setZero();
        const Eigen::Index begin = spin_up + trace * per_trace;
        for (Eigen::Index i = begin; i < begin + per_trace; ++i) {
            advance(stream, cells, sky, i, first_s + double(i) * stream.step_s, gain_heat, water);
            sum += water;
        }
        record.air_degC[trace] = sky.air_degC.segment(begin, per_trace).mean();
        record.shortwave_W_m2[trace] = sky.shortwave_W_m2.segment(begin, per_trace).mean();
        looker.look(sum / double(per_trace), cells.light, trace, record, random);
    }
    std::sort(record.inflows.begin(), record.inflows.end(),
              [](const TrueInflow& a, const TrueInflow& b) {
                  return a.inflow.stream_m < b.inflow.stream_m;
              });
    looker.spoil(record, random);
    return record;
}

} // namespace rillstrand::physics

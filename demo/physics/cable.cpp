// SPDX-License-Identifier: Apache-2.0
#include "cable.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::physics {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

double along(const Eigen::ArrayXd& x, const Eigen::ArrayXd& y, double at) {
    Eigen::Index i = 1;
    while (i + 1 < x.size() && x[i] < at)
        ++i;
    return y[i - 1] + (at - x[i - 1]) * (y[i] - y[i - 1]) / (x[i] - x[i - 1]);
}

/// 0 outside, 1 inside, with edges a metre wide.
double within(double x, double from_m, double to_m) {
    const double edge = std::min(1.0, 0.3 * (to_m - from_m)) + 1e-9;
    return std::clamp(std::min(x - from_m, to_m - x) / edge + 0.5, 0.0, 1.0);
}

} // namespace

double fibre_at(const Record& record, double stream_m) {
    return along(record.slack_edges_m, record.slack_fibre_m, stream_m);
}

Looker::Looker(const Stream& stream, const Cable& cable, std::mt19937_64& random)
    : m_stream(stream), m_cable(cable) {
    std::uniform_real_distribution<double> slack(cable.slack_low, cable.slack_high);
    std::normal_distribution<double> normal;
    const auto pieces = static_cast<Eigen::Index>(std::ceil(stream.length_m / 100.0));
    m_edges_m = Eigen::ArrayXd::LinSpaced(pieces + 1, 0.0, stream.length_m);
    m_fibre_at_edges_m = Eigen::ArrayXd::Zero(pieces + 1);
    for (Eigen::Index i = 0; i < pieces; ++i)
        m_fibre_at_edges_m[i + 1] =
            m_fibre_at_edges_m[i] + (m_edges_m[i + 1] - m_edges_m[i]) * (1.0 + slack(random));
    const double length = m_fibre_at_edges_m[pieces];
    const auto channels = static_cast<Eigen::Index>(std::floor(length / cable.sampling_m));
    m_channel_m =
        Eigen::ArrayXd::LinSpaced(channels, 0.0, double(channels - 1)) * cable.sampling_m +
        0.5 * cable.sampling_m;

    const double sigma = cable.response_m / 2.354820; // full width at half maximum of a Gaussian
    const double reach = cable.box_response ? 0.5 * cable.response_m : 3.0 * sigma;
    const auto cells = static_cast<Eigen::Index>(std::lround(stream.length_m / stream.cell_m));
    for (Eigen::Index j = 0; j < channels; ++j) {
        const double at = along(m_fibre_at_edges_m, m_edges_m, m_channel_m[j]);
        const auto first = std::clamp(static_cast<Eigen::Index>((at - reach) / stream.cell_m) - 1,
                                      Eigen::Index{0}, cells - 1);
        const auto last = std::clamp(static_cast<Eigen::Index>((at + reach) / stream.cell_m) + 1,
                                     first, cells - 1);
        Tap tap{first, Eigen::ArrayXd::Zero(last - first + 1)};
        for (Eigen::Index i = first; i <= last; ++i) { // the response's mean over each cell
            const double a = double(i) * stream.cell_m - at;
            const double b = a + stream.cell_m;
            tap.weight[i - first] = cable.box_response
                                        ? std::max(0.0, std::min(b, reach) - std::max(a, -reach))
                                        : std::erf(b / (sigma * std::sqrt(2.0))) -
                                              std::erf(a / (sigma * std::sqrt(2.0)));
        }
        tap.weight /= tap.weight.sum();
        m_taps.push_back(tap);
    }
    const Eigen::ArrayXd fibre_m = cable.against
                                       ? Eigen::ArrayXd(cable.start_fibre_m + length - m_channel_m)
                                       : Eigen::ArrayXd(cable.start_fibre_m + m_channel_m);
    m_noise_K = cable.noise_K * (1.0 + cable.noise_growth_per_km * fibre_m / 1000.0);
    m_offset_K = Eigen::ArrayXd::NullaryExpr(
        channels, [&](Eigen::Index) { return cable.channel_offset_K * normal(random); });
    for (const auto& [where_m, jump_K] : cable.losses) {
        const double fibre = along(m_edges_m, m_fibre_at_edges_m, where_m);
        // a loss acts on all that lies farther from the instrument
        for (Eigen::Index j = 0; j < channels; ++j)
            if (cable.against ? m_channel_m[j] <= fibre : m_channel_m[j] >= fibre)
                m_offset_K[j] += jump_K;
    }
    m_memory.resize(cable.patches.size());
}

Record Looker::blank(double start_s, Eigen::Index traces) const {
    Record record;
    record.time_s =
        Eigen::ArrayXd::LinSpaced(traces, 0.5, double(traces) - 0.5) * m_cable.interval_s + start_s;
    const double length = m_fibre_at_edges_m[m_fibre_at_edges_m.size() - 1];
    const double low = m_cable.start_fibre_m;
    record.fibre_m = m_channel_m + low;
    record.slack_edges_m = m_edges_m;
    record.slack_fibre_m = m_fibre_at_edges_m + low;
    if (m_cable.against) {
        record.fibre_m = (low + length) - m_channel_m;
        record.slack_fibre_m = (low + length) - m_fibre_at_edges_m;
    }
    record.from_fibre_m = record.fibre_m.minCoeff();
    record.to_fibre_m = record.fibre_m.maxCoeff();
    record.temperature_degC.resize(traces, m_channel_m.size());
    record.air_degC.resize(traces);
    record.shortwave_W_m2.resize(traces);
    return record;
}

/// A plume keeps to one bank: the difference between the cable and the section's mean decays
/// with distance.
void Looker::add_plumes(const Eigen::ArrayXd& water_degC, Eigen::ArrayXd& felt) const {
    for (const PointInflow& inflow : m_stream.inflows) {
        const auto cell = static_cast<Eigen::Index>(inflow.stream_m / m_stream.cell_m);
        if (inflow.mixing_m <= 0.0 || inflow.bank == 0.0 || cell < 1 || cell >= felt.size())
            continue;
        const double step = water_degC[cell] - water_degC[cell - 1];
        for (Eigen::Index i = cell; i < felt.size(); ++i) {
            const double decay =
                std::exp(-(double(i - cell) + 0.5) * m_stream.cell_m / inflow.mixing_m);
            if (decay < 1e-4)
                break;
            felt[i] += inflow.bank * step * decay;
        }
    }
}

void Looker::add_patches(const Eigen::ArrayXd& light, double air_degC, double sun_W_m2,
                         Eigen::ArrayXd& felt) {
    for (std::size_t k = 0; k < m_cable.patches.size(); ++k) {
        const Patch& patch = m_cable.patches[k];
        const auto first =
            std::clamp(static_cast<Eigen::Index>((patch.from_m - 1.0) / m_stream.cell_m),
                       Eigen::Index{0}, felt.size() - 1);
        const auto last =
            std::clamp(static_cast<Eigen::Index>((patch.to_m + 1.0) / m_stream.cell_m), first,
                       felt.size() - 1);
        const bool slow = patch.kind == Patch::Kind::buried || patch.kind == Patch::Kind::pool;
        if (slow && m_memory[k].size() == 0)
            m_memory[k] = felt.segment(first, last - first + 1);
        for (Eigen::Index i = first; i <= last; ++i) {
            const double x = (double(i) + 0.5) * m_stream.cell_m;
            const double share = within(x, patch.from_m, patch.to_m);
            const double sun = sun_W_m2 * light[i] / 1000.0;
            double target = felt[i];
            if (slow) {
                double& kept = m_memory[k][i - first];
                kept += (felt[i] - kept) *
                        (1.0 - std::exp(-m_cable.interval_s / (3600.0 * patch.strength)));
                target = kept + (patch.kind == Patch::Kind::pool ? 0.4 * sun : 0.0);
            } else if (patch.kind == Patch::Kind::sunlit) {
                target += patch.strength * sun;
            } else if (patch.kind == Patch::Kind::dry) {
                target += patch.strength * (air_degC + 4.0 * sun - felt[i]);
            } else {
                target += patch.strength * (patch.seep_degC - felt[i]);
            }
            felt[i] += share * (target - felt[i]);
        }
    }
}

void Looker::look(const Eigen::ArrayXd& water_degC, const Eigen::ArrayXd& light, Eigen::Index trace,
                  Record& record, std::mt19937_64& random) {
    std::normal_distribution<double> normal;
    Eigen::ArrayXd felt = water_degC;
    add_plumes(water_degC, felt);
    add_patches(light, record.air_degC[trace], record.shortwave_W_m2[trace], felt);
    const double keep = std::exp(-m_cable.interval_s / (8.0 * 3600.0));
    m_drift_K = keep * m_drift_K + std::sqrt(1.0 - keep * keep) * m_cable.drift_K * normal(random);
    const double common = m_drift_K + m_cable.jitter_K * normal(random);
    for (Eigen::Index j = 0; j < m_channel_m.size(); ++j) {
        const Tap& tap = m_taps[static_cast<std::size_t>(j)];
        const double seen = (tap.weight * felt.segment(tap.first, tap.weight.size())).sum();
        record.temperature_degC(trace, j) =
            static_cast<float>(seen + common + m_offset_K[j] + m_noise_K[j] * normal(random));
    }
}

void Looker::spoil(Record& record, std::mt19937_64& random) const {
    std::uniform_real_distribution<double> wild(-30.0, 60.0);
    for (const auto& [from_m, to_m] : m_cable.dead)
        for (Eigen::Index j = 0; j < m_channel_m.size(); ++j) {
            const double at = along(m_fibre_at_edges_m, m_edges_m, m_channel_m[j]);
            if (at >= from_m && at <= to_m)
                for (Eigen::Index i = 0; i < record.time_s.size(); ++i)
                    record.temperature_degC(i, j) = static_cast<float>(wild(random));
        }
    for (const auto& [from_h, to_h] : m_cable.gaps_h)
        for (Eigen::Index i = 0; i < record.time_s.size(); ++i) {
            const double hour = (record.time_s[i] - record.time_s[0]) / 3600.0;
            if (hour >= from_h && hour < to_h)
                record.temperature_degC.row(i).setConstant(static_cast<float>(nan));
        }
    if (m_cable.against) {
        record.fibre_m.reverseInPlace();
        record.temperature_degC = record.temperature_degC.rowwise().reverse().eval();
    }
}

} // namespace rillstrand::physics

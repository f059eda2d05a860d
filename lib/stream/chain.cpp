// SPDX-License-Identifier: Apache-2.0
#include "stream/chain.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <numeric>

namespace rillstrand::stream {

namespace {

constexpr double next_within_m = 30.0;
constexpr double placed_to_m = 0.4;
constexpr double largest_part = 0.6;
constexpr std::size_t fewest = 3;

/// Runs of gains (by place) whose steps could be one ramp.
std::vector<std::vector<std::size_t>> chains_of(const std::vector<Inflow>& inflows,
                                                const std::vector<Gain>& gains,
                                                const std::vector<std::size_t>& owner) {
    std::vector<std::size_t> order(gains.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::sort(order.begin(), order.end(),
              [&](std::size_t a, std::size_t b) { return gains[a].from_m < gains[b].from_m; });
    std::vector<std::vector<std::size_t>> chains(1);
    for (const std::size_t g : order) {
        const Inflow& inflow = inflows[owner[g]];
        const bool loose = inflow.kind == Kind::step && !inflow.known &&
                           inflow.fibre_sd_m > placed_to_m && gains[g].log_gain > 0.0;
        const bool near = !chains.back().empty() &&
                          gains[g].from_m - gains[chains.back().back()].to_m <= next_within_m;
        if (!loose) {
            chains.emplace_back();
            continue;
        }
        if (!near)
            chains.emplace_back();
        chains.back().push_back(g);
    }
    std::erase_if(chains, [&](const std::vector<std::size_t>& chain) {
        double sum = 0.0, most = 0.0;
        for (const std::size_t g : chain) {
            sum += gains[g].log_gain;
            most = std::max(most, gains[g].log_gain);
        }
        return chain.size() < fewest || most > largest_part * sum;
    });
    return chains;
}

Gain joined_gain(const std::vector<std::size_t>& chain, const std::vector<Gain>& gains) {
    const auto n = chain.size();
    const auto at = [&](std::size_t k) { return gains[chain[k]].from_m; };
    Gain gain;
    gain.from_m = at(0) - 0.5 * (at(1) - at(0));
    gain.to_m = at(n - 1) + 0.5 * (at(n - 1) - at(n - 2));
    double variance = 0.0;
    for (const std::size_t g : chain) {
        gain.log_gain += gains[g].log_gain;
        variance += gains[g].log_gain_sd * gains[g].log_gain_sd;
    }
    gain.log_gain_sd = std::sqrt(variance);
    return gain;
}

Inflow joined_inflow(const Frame& frame, const Gain& gain, const std::vector<std::size_t>& chain,
                     const std::vector<Inflow>& inflows, const std::vector<std::size_t>& owner) {
    Inflow inflow = inflows[owner[chain[chain.size() / 2]]];
    inflow.kind = Kind::diffuse;
    const double a = frame.origin_m + frame.sign * gain.from_m;
    const double b = frame.origin_m + frame.sign * gain.to_m;
    inflow.fibre_from_m = std::min(a, b);
    inflow.fibre_to_m = std::max(a, b);
    inflow.fibre_m = 0.5 * (a + b);
    inflow.fibre_sd_m = 0.2 * (gain.to_m - gain.from_m);
    inflow.fraction = 1.0 - std::exp(-gain.log_gain);
    inflow.fraction_sd = std::exp(-gain.log_gain) * gain.log_gain_sd;
    inflow.score = gain.log_gain / gain.log_gain_sd;
    inflow.mixing_length_m = 0.0;
    inflow.anomaly_c = 0.0;
    for (const std::size_t g : chain)
        inflow.anomaly_c += inflows[owner[g]].anomaly_c;
    inflow.evidence = {"The stream follows the contrast as a ramp over " +
                       text::fixed(gain.to_m - gain.from_m, 0) +
                       " m: " + std::to_string(chain.size()) +
                       " small steps in a row, none of which has a place of its own."};
    return inflow;
}

} // namespace

void join_chains(const Frame& frame, std::vector<Inflow>& inflows, std::vector<Gain>& gains,
                 std::vector<std::size_t>& owner) {
    const auto chains = chains_of(inflows, gains, owner);
    if (chains.empty())
        return;
    std::vector<char> inflow_gone(inflows.size(), 0), gain_gone(gains.size(), 0);
    std::vector<Inflow> more_inflows;
    std::vector<Gain> more_gains;
    for (const auto& chain : chains) {
        more_gains.push_back(joined_gain(chain, gains));
        more_inflows.push_back(joined_inflow(frame, more_gains.back(), chain, inflows, owner));
        for (const std::size_t g : chain)
            gain_gone[g] = inflow_gone[owner[g]] = 1;
    }
    std::vector<std::size_t> moved(inflows.size());
    std::vector<Inflow> kept_inflows;
    for (std::size_t i = 0; i < inflows.size(); ++i) {
        moved[i] = kept_inflows.size();
        if (inflow_gone[i] == 0)
            kept_inflows.push_back(inflows[i]);
    }
    std::vector<Gain> kept_gains;
    std::vector<std::size_t> kept_owner;
    for (std::size_t g = 0; g < gains.size(); ++g)
        if (gain_gone[g] == 0) {
            kept_gains.push_back(gains[g]);
            kept_owner.push_back(moved[owner[g]]);
        }
    for (std::size_t k = 0; k < more_inflows.size(); ++k) {
        kept_gains.push_back(more_gains[k]);
        kept_owner.push_back(kept_inflows.size());
        kept_inflows.push_back(more_inflows[k]);
    }
    inflows = std::move(kept_inflows);
    gains = std::move(kept_gains);
    owner = std::move(kept_owner);
}

} // namespace rillstrand::stream

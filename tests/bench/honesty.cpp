// SPDX-License-Identifier: Apache-2.0
// Prints, as a Markdown table, how true the inflows of many simulated campaigns are.
#include "stream/scenarios.hpp"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <string>

namespace {

using rillstrand::stream::scenarios::Sort;
using rillstrand::stream::scenarios::Tally;

std::string part(int got, int all) {
    if (all == 0)
        return "-";
    return std::to_string(static_cast<int>(std::lround(100.0 * got / all))) + " % of " +
           std::to_string(all);
}

double middle(std::vector<double> v) {
    if (v.empty())
        return std::nan("");
    std::nth_element(v.begin(), v.begin() + static_cast<std::ptrdiff_t>(v.size() / 2), v.end());
    return v[v.size() / 2];
}

void print(const std::string& name, const Tally& t) {
    double ratio = 0.0;
    for (const double r : t.bound_ratio2)
        ratio += r / double(t.bound_ratio2.size());
    std::printf(
        "| %s | %s | %s | %s | %.2f | %.2f m, %s | %.1f %%, %s, %.1f x bound | %.2f K, %s | %s | "
        "%s, %d as inflow | %s, share %s | %s | %d of %d over | %.2f s |\n",
        name.c_str(), part(t.over3_found, t.over3).c_str(), part(t.one3_found, t.one3).c_str(),
        part(t.half1_found, t.half1).c_str(), t.false_inflows / t.km, middle(t.place_errors),
        part(t.places_in, t.places).c_str(), 100.0 * middle(t.share_errors),
        part(t.shares_in, t.shares).c_str(), std::sqrt(ratio), middle(t.source_errors),
        part(t.sources_in, t.sources).c_str(), part(t.flows_in, t.flows).c_str(),
        part(t.spots_found, t.spots).c_str(), t.spots_as_inflow,
        part(t.gains_found, t.gains).c_str(), part(t.gain_shares_in, t.gains_found).c_str(),
        part(t.tributaries_in, t.tributaries).c_str(), t.missed_over_limit, t.missed,
        t.seconds / std::max(1, t.campaigns));
    std::fflush(stdout);
}

} // namespace

/// honesty [seeds] [sort or `all`] [talk]
int main(int argc, char** argv) {
    const int first = argc > 4 ? std::atoi(argv[4]) : 1;
    const int seeds = argc > 1 ? std::atoi(argv[1]) : 20;
    const std::string only = argc > 2 ? argv[2] : "all";
    const bool talk = argc > 3;
    std::printf(
        "| campaign | over 3 %% | 1-3 %% | 0.5-1 %% | false a km | place: median, in 2 sd | share: "
        "median error, in 2 sd, rms | Tin: median, in 2 sd | discharge in 2 sd | spots | "
        "diffuse | tributary in 2 sd | missed | time |\n");
    std::printf(
        "| --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- | --- |\n");
    for (const auto& [name, sort] : {std::pair<const char*, Sort>{"plain", Sort::plain},
                                     {"nothing", Sort::nothing},
                                     {"hard", Sort::hard},
                                     {"many", Sort::many},
                                     {"winter", Sort::winter},
                                     {"small", Sort::small},
                                     {"small, nothing", Sort::small}}) {
        if (only != "all" && only != name)
            continue;
        Tally tally;
        for (int seed = first; seed <= seeds; ++seed) {
            const auto campaign = rillstrand::stream::scenarios::make(
                sort, static_cast<unsigned>(seed), std::string(name) != "small, nothing");
            if (talk)
                std::printf("%s %d\n", name, seed);
            const auto start = std::chrono::steady_clock::now();
            const auto findings = rillstrand::stream::interpret(campaign.input);
            tally.seconds +=
                std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count();
            if (talk) {
                for (const auto& p : campaign.cable.patches)
                    std::printf("   patch %d %.1f-%.1f strength %.2f\n", static_cast<int>(p.kind),
                                rillstrand::physics::fibre_at(campaign.truth, p.from_m),
                                rillstrand::physics::fibre_at(campaign.truth, p.to_m), p.strength);
                for (const auto& l : campaign.cable.losses)
                    std::printf("   loss %.1f %.2f\n",
                                rillstrand::physics::fibre_at(campaign.truth, l.first), l.second);
                for (const auto& a : findings.artefacts)
                    std::printf("   artefact %s %.1f-%.1f %.3f K\n", a.kind.c_str(), a.from_m,
                                a.to_m, a.size_c);
            }
            rillstrand::stream::scenarios::score(campaign, findings, tally, talk);
        }
        print(name, tally);
    }
    return 0;
}

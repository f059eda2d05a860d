// SPDX-License-Identifier: Apache-2.0
#include "stream/report.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>

namespace rillstrand::stream {

std::string method_text(const Frame& frame, const Solution& solution,
                        const StreamFindings& findings) {
    const Weighting& w = solution.reading.weighting;
    std::string s =
        "Inflows were sought in " + std::to_string(frame.n_place()) + " channels and " +
        std::to_string(frame.n_time()) + " means over " + text::fixed(frame.interval_s / 60.0, 0) +
        " min. The steady mixing law (Kobayashi 1985, J. Hydrol. 76, 155-162; Westhoff et "
        "al. 2007, Hydrol. Earth Syst. Sci. 11, 1469-1480) was applied to a weighted mean "
        "over time";
    s += w.name.empty()
             ? ", weighted by the contrast between inflow and stream"
             : ", weighted by the contrast between inflow and stream with " + w.name + " shut out";
    s += ". The background along the fibre is an integrated random walk with free level and slope, "
         "its "
         "roughness estimated from the reach (Harvey 1989); inflows are steps seen through a "
         "spatial "
         "response of " +
         text::fixed(2.563103 * frame.response_sd_m, 2) +
         " m, with a plume that mixes in where the record shows one. Steps were added one by one "
         "and "
         "kept if they passed z = " +
         text::fixed(findings.threshold_z, 2) + ", so that at most " +
         text::fixed(100.0 * findings.family_level, 0) +
         " % of reaches without inflow would report any (Bonferroni). ";
    if (findings.inflow_temperature_given)
        s += "The inflow temperature was given. ";
    else if (std::isfinite(findings.inflow_temperature_c))
        s += "The inflow temperature, " + text::fixed(findings.inflow_temperature_c, 2) + " +- " +
             text::fixed(findings.inflow_temperature_sd_c, 2) +
             " degC, was estimated from how the inflows damp the daily swing and shift its mean. ";
    else
        s += "The inflow temperature is not known and not resolvable here; shares rest on how the "
             "inflows damp the stream's changes. ";
    s += "White noise of a mean was " + text::fixed(1e3 * findings.noise_c, 1) +
         " mK (second differences in time).";
    return s;
}

void rank(std::vector<Inflow>& inflows) {
    double most = 0.0;
    const auto worth = [](const Inflow& i) {
        const double share = std::isfinite(i.fraction) ? std::max(0.0, i.fraction) : 0.01;
        return std::sqrt(share) * std::min(1.0, i.score / 10.0);
    };
    for (const Inflow& i : inflows)
        most = std::max(most, worth(i));
    for (Inflow& i : inflows)
        i.priority = most > 0.0 ? worth(i) / most : 0.0;
}

} // namespace rillstrand::stream

// SPDX-License-Identifier: Apache-2.0
#include "fibre_map.hpp"

#include <algorithm>

namespace rillstrand::geo {

FibreMap::FibreMap(const campaign::Campaign& campaign) {
    std::vector<Taken> all;
    for (const auto& s : campaign.stretches)
        if (s.setting == campaign::Setting::coil || s.setting == campaign::Setting::bath)
            all.push_back({s.from_m, s.to_m});
    for (const auto& b : campaign.baths)
        all.push_back({b.from_m, b.to_m});
    const auto vertical = [&](const std::string& name) {
        if (const auto* s = campaign.find_stretch(name))
            all.push_back({s->from_m, s->to_m});
    };
    for (const auto& c : campaign.columns)
        vertical(c.stretch);
    for (const auto& b : campaign.beds)
        vertical(b.stretch);
    std::sort(all.begin(), all.end(),
              [](const Taken& a, const Taken& b) { return a.from_m < b.from_m; });
    for (const auto& taken : all) {
        if (!m_taken.empty() && taken.from_m <= m_taken.back().to_m)
            m_taken.back().to_m = std::max(m_taken.back().to_m, taken.to_m);
        else
            m_taken.push_back(taken);
    }
    if (campaign.placement)
        m_turnaround_m = campaign.placement->turnaround_m;
}

double FibreMap::unfolded(double fibre_m) const {
    double path = fibre_m;
    for (const auto& taken : m_taken) {
        if (taken.from_m >= fibre_m)
            break;
        path -= std::min(taken.to_m, fibre_m) - taken.from_m;
    }
    return path;
}

double FibreMap::path_m(double fibre_m) const {
    const double path = unfolded(fibre_m);
    if (!m_turnaround_m || fibre_m <= *m_turnaround_m)
        return path;
    return 2.0 * unfolded(*m_turnaround_m) - path;
}

int FibreMap::leg(double fibre_m) const {
    return m_turnaround_m && fibre_m > *m_turnaround_m ? 2 : 1;
}

} // namespace rillstrand::geo

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <vector>

namespace rillstrand::geo {

/// Fibre distance to length of cable that covers ground: coils, baths, masts and rods are taken
/// out, and beyond the turnaround the cable runs back along itself.
class FibreMap {
public:
    explicit FibreMap(const campaign::Campaign& campaign);
    /// Length of cable over ground, m; the same for all channels of a coil.
    double path_m(double fibre_m) const;
    /// 1 before the turnaround, 2 beyond it, 1 where there is none.
    int leg(double fibre_m) const;

private:
    double unfolded(double fibre_m) const;
    struct Taken {
        double from_m;
        double to_m;
    };
    std::vector<Taken> m_taken; ///< sorted, not overlapping
    std::optional<double> m_turnaround_m;
};

} // namespace rillstrand::geo

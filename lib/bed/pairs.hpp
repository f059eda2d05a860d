// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "bed/bed.hpp"
#include "bed/harmonics.hpp"
#include "bed/profiles.hpp"

#include <vector>

namespace rillstrand::bed {

/// The daily wave at two depths, chosen so that its damping is known best.
struct Pair {
    const Place* upper = nullptr;
    const Place* lower = nullptr;
    Harmonic above, below;
};

/// The pair of one window whose logarithm of the amplitude ratio per depth is known best. A pair
/// whose lower amplitude is under five of its sd does not count: `lower` is then null.
/// @param height_m  places less deep than half of it average over water
Pair choose_pair(const std::vector<Place>& places, const std::vector<Harmonic>& waves,
                 double height_m);

/// Flux of one pair by amplitude and phase together, by amplitude, and by phase (size only), with
/// sd from both waves, the stated properties and the spacing.
/// Sources: see heat/vertical_flow.hpp.
std::vector<FluxRow> pair_fluxes(const Pair& pair, const campaign::Bed& stated, const Trust& trust);

/// Plausible effective diffusivity of a streambed, m2/d: 0.028 to 0.180.
/// Source: Irvine et al. (2015), J. Hydrol. 531, 728-737, doi:10.1016/j.jhydrol.2015.10.054.
bool plausible_diffusivity(double diffusivity_m2_s);

} // namespace rillstrand::bed

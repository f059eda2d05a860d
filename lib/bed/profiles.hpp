// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "bed/bed.hpp"

#include <string>
#include <vector>

namespace rillstrand::bed {

/// What one place of the rod is good for.
enum class Use {
    fitted,
    boundary,
    water, ///< above the bed: together the upper boundary
    above_bed,
    straddles_surface, ///< its fibre averages over water and bed
    too_deep,          ///< below the reach of what changes within days
    too_few_samples,
    noisy
};
std::string to_string(Use use);

/// One place in the bed or above it.
struct Place {
    Eigen::Index column = 0; ///< of the input
    double fibre_m = 0.0;
    double depth_m = 0.0;
    double noise_K = 0.0;
    Use use = Use::fitted;
};

/// Every place with its depth and use, in order of depth. Boundaries are the uppermost and the
/// lowermost that are used.
std::vector<Place> sort_places(const BedInput& input);

/// Height that a temperature of a wound fibre is the mean of; 0 for a straight one.
double averaging_height_m(const BedInput& input);

/// Places that are used, in order of depth.
std::vector<Place> used(const std::vector<Place>& places);

/// The piece [from_s, to_s) of the record between the boundaries, cut into segments where a
/// boundary is missing for over two hours (or two samples); segments shorter than min_s are left
/// out.
Profile cut_profile(const BedInput& input, const std::vector<Place>& chosen, double from_s,
                    double to_s, double min_s);

} // namespace rillstrand::bed

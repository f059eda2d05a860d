// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"
#include "record/source.hpp"

namespace rillstrand::geo {

/// Where a cold or warm spot lay on the fibre.
struct FoundMark {
    double fibre_m = 0.0;
    double sd_m = 0.0;
    double peak_K = 0.0;  ///< temperature difference at its strongest channel
    double noise_K = 0.0; ///< of one channel's difference
};

/// Finds the spot in the difference between the mark's time and the same time before and after.
/// The centre is the centroid of the connected channels over a third of the peak, weighted by the
/// difference; its sd is propagated from the difference's noise, with the sampling grid added.
/// @throws DataError with the numbers where no spot stands out by six sd
FoundMark find_mark(const record::Source& source, const campaign::Mark& mark,
                    const std::string& place);

} // namespace rillstrand::geo

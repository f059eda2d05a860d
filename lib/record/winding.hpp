// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <optional>

namespace rillstrand::record {

/// Height gained by a metre of fibre: p / sqrt((pi D)^2 + p^2) on a winding of diameter D (to the
/// fibre's centre line) and pitch p, 1 on a straight vertical cable.
double height_per_fibre(const std::optional<campaign::Winding>& winding);

/// Depth below the datum of a place on the fibre of a mast or a rod, m.
double depth_below_datum_m(double fibre_m, double datum_fibre_m, campaign::Direction direction,
                           const std::optional<campaign::Winding>& winding);

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/winding.hpp"

#include <cmath>
#include <numbers>

namespace rillstrand::record {

double height_per_fibre(const std::optional<campaign::Winding>& winding) {
    if (!winding)
        return 1.0;
    return winding->pitch_m / std::hypot(std::numbers::pi * winding->diameter_m, winding->pitch_m);
}

double depth_below_datum_m(double fibre_m, double datum_fibre_m, campaign::Direction direction,
                           const std::optional<campaign::Winding>& winding) {
    const double way = direction == campaign::Direction::down ? 1.0 : -1.0;
    return way * (fibre_m - datum_fibre_m) * height_per_fibre(winding);
}

} // namespace rillstrand::record

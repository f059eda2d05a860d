// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/quantity.hpp"

#include <vector>

namespace rillstrand::heat {

/// A quantity with one standard deviation.
struct Uncertain {
    double value = 0.0;
    double sd = 0.0;
};

/// Share of the discharge just below one inflow, with what may be said of it.
struct MixingShare {
    double fraction = 0.0; ///< not clipped to [0, 1]; NaN where it is not defined
    double sd = 0.0;
    bool resolvable = false; ///< fraction is known to better than itself, and to better than 0.5
    bool physical = false;   ///< between 0 and 1
};

/// Groundwater share of the discharge just below one inflow.
///
/// Steady heat balance of two waters that mix fully; exchange with the air is left out.
/// f = (T_below - T_above) / (T_in - T_above). With independent errors and D = T_in - T_above:
/// sd(f)^2 = (sd_below / D)^2 + ((1 - f) sd_above / D)^2 + (f sd_in / D)^2.
///
/// @throws DataError if T_in equals T_above: no contrast, no share
/// Source: Kobayashi (1985), J. Hydrol. 76, 155-162; Westhoff et al. (2007), Hydrol. Earth Syst.
/// Sci. 11, 1469-1480.
MixingShare groundwater_share(Uncertain above_degC, Uncertain below_degC, Uncertain inflow_degC);

/// Discharge of the inflow from its share and the stream's discharge above it: Q f / (1 - f).
Uncertain inflow_discharge_m3s(Uncertain share, Uncertain above_m3s);

/// A discharge and its temperature.
struct Water {
    double discharge_m3s = 0.0;
    Celsius temperature = Celsius::from_degC(0.0);
};

/// Both waters mixed fully, with equal heat capacity.
Water mixed(const Water& stream, const Water& inflow);

} // namespace rillstrand::heat

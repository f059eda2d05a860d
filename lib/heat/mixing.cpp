// SPDX-License-Identifier: Apache-2.0
#include "heat/mixing.hpp"

#include "base/error.hpp"

#include <cmath>

namespace rillstrand::heat {

MixingShare groundwater_share(Uncertain above_degC, Uncertain below_degC, Uncertain inflow_degC) {
    const double contrast_K = inflow_degC.value - above_degC.value;
    if (contrast_K == 0.0)
        throw DataError{
            "inflow and stream have the same temperature: there is no contrast to tell a "
            "share by; choose another hour or season"};
    MixingShare share;
    share.fraction = (below_degC.value - above_degC.value) / contrast_K;
    share.sd = std::sqrt(std::pow(below_degC.sd / contrast_K, 2) +
                         std::pow((1.0 - share.fraction) * above_degC.sd / contrast_K, 2) +
                         std::pow(share.fraction * inflow_degC.sd / contrast_K, 2));
    share.physical = share.fraction >= 0.0 && share.fraction <= 1.0;
    share.resolvable =
        share.sd < 0.5 && (share.fraction == 0.0 || share.sd < std::abs(share.fraction));
    return share;
}

Uncertain inflow_discharge_m3s(Uncertain share, Uncertain above_m3s) {
    const double odds = share.value / (1.0 - share.value);
    const double by_share = above_m3s.value / std::pow(1.0 - share.value, 2) * share.sd;
    return {above_m3s.value * odds, std::hypot(by_share, odds * above_m3s.sd)};
}

Water mixed(const Water& stream, const Water& inflow) {
    const double total = stream.discharge_m3s + inflow.discharge_m3s;
    return {total, Celsius::from_degC((stream.discharge_m3s * stream.temperature.degC() +
                                       inflow.discharge_m3s * inflow.temperature.degC()) /
                                      total)};
}

} // namespace rillstrand::heat

// SPDX-License-Identifier: Apache-2.0
#include "snow/snow.hpp"

#include <cmath>

namespace rillstrand::snow {

Eigen::Array<State, Eigen::Dynamic, Eigen::Dynamic> threshold_states(const Days& days,
                                                                     double swing_below_K,
                                                                     double mean_below_degC,
                                                                     double minimum_days) {
    const Eigen::Index n = days.n_day(), places = days.mean_degC.cols();
    Eigen::Array<State, Eigen::Dynamic, Eigen::Dynamic> state(n, places);
    for (Eigen::Index j = 0; j < places; ++j) {
        Eigen::Index begin = 0, length = 0;
        const auto close_run = [&](Eigen::Index end) {
            if (length > 0 && static_cast<double>(length) < minimum_days)
                for (Eigen::Index d = begin; d < end; ++d)
                    if (state(d, j) == State::snow)
                        state(d, j) = State::bare;
            length = 0;
        };
        for (Eigen::Index d = 0; d < n; ++d) {
            if (!std::isfinite(days.swing_K(d, j))) {
                state(d, j) = State::unknown;
                continue;
            }
            const bool snow =
                days.swing_K(d, j) < swing_below_K && days.mean_degC(d, j) < mean_below_degC;
            state(d, j) = snow ? State::snow : State::bare;
            if (!snow)
                close_run(d);
            else if (length++ == 0)
                begin = d;
        }
        close_run(n);
    }
    return state;
}

} // namespace rillstrand::snow

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <utility>
#include <vector>

namespace rillstrand::geo {

/// Height at a place of the path between surveyed heights: straight between neighbours, that of the
/// outermost beyond them, NaN where none was surveyed.
/// @param known  path and height, m, by path
double height_between(const std::vector<std::pair<double, double>>& known, double path_m);

} // namespace rillstrand::geo

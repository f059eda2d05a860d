// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <utility>
#include <vector>

namespace rillstrand::geo {

/// Height at a place of the path between surveyed heights: straight between neighbours, that of the
/// outermost beyond them, NaN where none was surveyed.
/// @param known  path and height, m, by path
double height_between(const std::vector<std::pair<double, double>>& known, double path_m);

/// Depth below the datum of a channel of a mast or rod: along a straight cable, or down its
/// winding, whose turn of diameter D and pitch p takes sqrt((pi D)^2 + p^2) of fibre.
double winding_depth_m(double along_fibre_m, double diameter_m, double pitch_m);

} // namespace rillstrand::geo

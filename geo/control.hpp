// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "crs.hpp"

#include <filesystem>
#include <string>
#include <vector>

namespace rillstrand::geo {

/// X = x0 + scale (x cos t - y sin t), Y = y0 + scale (x sin t + y cos t).
struct Similarity {
    double x0 = 0.0, y0 = 0.0;
    double scale = 1.0;
    double rotation_rad = 0.0; ///< counter-clockwise
    PointsXY apply(const PointsXY& points) const;
};

/// Weighted least squares for the four unknowns.
/// @param sd_m  of each point's coordinates; smaller counts more
/// @throws DataError with fewer than two points, or all at one place
Similarity fit_similarity(const PointsXY& from, const PointsXY& to, const Eigen::ArrayXd& sd_m);

/// A site's own grid tied to the world by control points.
struct ControlFit {
    Similarity similarity;
    std::vector<std::string> labels;
    std::vector<double> residual_m;
    std::vector<bool> used;
    Warnings warnings;
};

/// Reads `local_x,local_y,x,y[,sd_m][,label]` and fits; with four points or more one that lies off
/// by more than five sd of the others' fit is set aside by name.
ControlFit fit_control(const std::filesystem::path& file);

} // namespace rillstrand::geo

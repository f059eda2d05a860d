// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <filesystem>

namespace rillstrand::column {

/// Area of the lake at each depth below its surface, straight between the given depths.
class Hypsograph {
public:
    /// @param depth_m  increasing from 0, m
    /// @param area_m2  not increasing, the first over 0
    Hypsograph(Eigen::ArrayXd depth_m, Eigen::ArrayXd area_m2);
    /// A column of constant area, as it is without a hypsograph.
    static Hypsograph constant(double depth_m);

    double area_m2(double depth_m) const; ///< 0 below the bottom
    double surface_m2() const { return m_area_m2(0); }
    double bottom_m() const { return m_depth_m(m_depth_m.size() - 1); }
    const Eigen::ArrayXd& depths_m() const { return m_depth_m; }

private:
    Eigen::ArrayXd m_depth_m, m_area_m2;
};

/// Reads columns depth_m and area_m2 of a delimited file.
/// @throws DataError naming file and line where depths do not increase from 0 or areas grow
Hypsograph read_hypsograph(const std::filesystem::path& file);

} // namespace rillstrand::column

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "column/column.hpp"
#include "column/profile.hpp"

namespace rillstrand::column {

/// Neighbouring channels taken together, so that a winding's thousands become some hundred depths,
/// each with the noise that its mean really has.
class ReadingMaker {
public:
    explicit ReadingMaker(const ColumnInput& input);
    /// The column at one time. Channels in the air are left out, as are those so near the surface
    /// that the fibre's averaging mixes air in; where the cable sees the air, its share in the next
    /// ones is taken out.
    /// @param in_air  set to the number of channels above the surface
    Readings at(Eigen::Index i_time, int& in_air) const;
    /// Depth of the deepest group at any time, m.
    double deepest_m() const;
    double kernel_sd_m() const { return m_kernel_m; }
    Eigen::Index groups() const { return m_below_m.size(); }

private:
    struct Group {
        Eigen::Index first, count;
    };
    double depth_m(Eigen::Index group, Eigen::Index i_time) const;
    double mean_degC(const Group& group, Eigen::Index i_time, double& traces) const;
    const ColumnInput& m_input;
    std::vector<Group> m_groups; ///< by depth
    Eigen::ArrayXd m_below_m;    ///< below the datum
    Eigen::ArrayXd m_noise_K;    ///< of a group's mean in a single trace
    double m_kernel_m;
};

} // namespace rillstrand::column

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <vector>

/// Heat carried along the vertical by conduction and by water that moves, through time, and what a
/// small change of every unknown does to it.
namespace rillstrand::bed {

/// Rows [first, first + count) of the series without a gap between them.
struct Segment {
    Eigen::Index first = 0;
    Eigen::Index count = 0;
};

/// A measured vertical between an upper and a lower boundary.
struct Profile {
    Eigen::ArrayXd time_s;      ///< evenly spaced inside a segment
    double step_s = 0.0;        ///< between two rows
    double top_m = 0.0;         ///< depth of the upper boundary
    double bottom_m = 0.0;      ///< depth of the lower boundary
    Eigen::ArrayXd top_degC;    ///< size n_time, without NaN inside segments
    Eigen::ArrayXd bottom_degC; ///< size n_time, without NaN inside segments
    Eigen::ArrayXd depth_m;     ///< of the observed places between, increasing
    /// Full width at half maximum of the height that a temperature is the mean of, Gaussian; above
    /// the upper boundary is mixed water of its temperature. 0: upper and lower boundary and all
    /// places are means over one and the same height inside the bed, and need no sharpening.
    double averaging_m = 0.0;
    double settle_s = 0.0; ///< of each segment nothing is compared so long: its first profile fades
    Eigen::ArrayXXd observed_degC; ///< row = time, column = place; NaN where missing
    std::vector<Segment> segments;
};

/// Where each unknown stands in the vector of unknowns.
struct Layout {
    Eigen::Index n_layer = 1;  ///< depths at which properties are free
    Eigen::Index n_kernel = 0; ///< 2 where the averaging height and the datum are free
    Eigen::Index n_place = 0;  ///< observed places, each with an offset of its own
    Eigen::Index n_start = 0;  ///< depths at which a segment's first profile is free
    Eigen::Index n_segment = 0;
    Eigen::Index n_knot = 0;
    double first_knot_s = 0.0;
    double knot_s = 0.0; ///< between two knots

    Eigen::Index conductivity() const { return 0; } ///< natural logs against the stated one
    Eigen::Index capacity() const { return n_layer; }
    Eigen::Index kernel() const { return 2 * n_layer; } ///< log of the height, then shift in cm
    Eigen::Index offsets() const { return kernel() + n_kernel; }
    Eigen::Index starts() const { return offsets() + n_place; }
    /// Fluxes in flux_unit_m_s at the stated capacity; the true flux is exp(mean log capacity)
    /// times that. Temperatures tell the front's velocity, and only the stated properties tell the
    /// flux: counted so, a prior on how the flux changes does not pull at the capacity.
    Eigen::Index flux() const { return starts() + n_start * n_segment; }
    Eigen::Index top() const { return flux() + n_knot; } ///< K, on top of measured
    Eigen::Index bottom() const { return top() + n_knot; }
    Eigen::Index size() const { return bottom() + n_knot; }
};

/// Unknown fluxes are counted in this unit, 0.1 m/d, so that all unknowns are of one size.
inline constexpr double flux_unit_m_s = 0.1 / 86400.0;

/// Weighted normal equations of the misfit around one vector of unknowns.
struct Normal {
    Eigen::MatrixXd hessian;    ///< sum of w J J^T
    Eigen::VectorXd gradient;   ///< sum of w J r
    double misfit = 0.0;        ///< sum of w r^2
    Eigen::ArrayXXd residual_K; ///< observed minus modelled; NaN where nothing was observed
};

/// Marches C dT/dt = d/dz(lambda dT/dz) - C_water q dT/dz through a profile.
///
/// Finite volumes on a grid that is finer on top, central in space; in time a diagonally implicit
/// Runge-Kutta method of second order that damps what is too short for the grid (Alexander 1977,
/// SIAM J. Numer. Anal. 14, 1006-1021, doi:10.1137/0714068). A mean over some centimetres obeys
/// the same equation in uniform ground, so temperatures that a fibre averages over one and the same
/// length need no sharpening.
class March {
public:
    /// @param conductivity_W_m_K, capacity_J_m3_K  stated properties, the origin of the unknowns
    March(const Profile& profile, const Layout& layout, double conductivity_W_m_K,
          double capacity_J_m3_K);

    /// The misfit and, unless `misfit_only`, the normal equations.
    /// @param unknowns  size layout.size()
    /// @param weight    1 / variance of one sample, size n_place
    Normal pass(const Eigen::VectorXd& unknowns, const Eigen::ArrayXd& weight,
                bool misfit_only) const;

    /// Weights of the n_layer depths at any depth: rows sum to 1.
    Eigen::ArrayXd layer_weights(double depth_m) const;

private:
    struct Medium;
    struct Run;
    Eigen::MatrixXd weights_of_nodes(double log_height, double shift_cm) const;
    Medium medium(const Eigen::VectorXd& unknowns) const;
    void march_segment(Run& run, Eigen::Index i_segment) const;
    void start(Run& run, Eigen::Index i_segment) const;
    void step(Run& run, Eigen::Index i_row) const;
    void step_sensitivity(Run& run, Eigen::Index i_row) const;
    void observe(Run& run, Eigen::Index i_row) const;
    void activate(Run& run, double time_s) const;
    void flush(Run& run) const;

    const Profile& m_profile;
    const Layout& m_layout;
    double m_conductivity, m_capacity;
    Eigen::Index m_memory = 1;       ///< knots whose effect is still felt
    Eigen::ArrayXd m_depth_m;        ///< grid, boundaries included
    Eigen::ArrayXXd m_layer_at_node; ///< row = layer, column = node
    Eigen::ArrayXXd m_layer_at_face; ///< row = layer, column = face below the node
    Eigen::ArrayXXd m_start_at_node; ///< row = start depth, column = node
};

} // namespace rillstrand::bed

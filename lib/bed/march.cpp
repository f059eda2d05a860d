// SPDX-License-Identifier: Apache-2.0
#include "bed/march.hpp"

#include "heat/ground.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace rillstrand::bed {

namespace {

using Eigen::ArrayXd;
using Eigen::ArrayXXd;
using Eigen::Index;

constexpr double gamma = 1.0 - 0.70710678118654752440; // of the Runge-Kutta method
constexpr double pi = 3.14159265358979323846;

/// Hat functions of n even nodes between two ends.
ArrayXd hats(Index n, double low, double high, double at) {
    ArrayXd w = ArrayXd::Zero(n);
    if (n == 1) {
        w(0) = 1.0;
        return w;
    }
    const double s = std::clamp((at - low) / (high - low), 0.0, 1.0) * static_cast<double>(n - 1);
    const auto k = std::min(static_cast<Index>(s), n - 2);
    w(k + 1) = s - static_cast<double>(k);
    w(k) = 1.0 - w(k + 1);
    return w;
}

/// Depths of a grid whose cells grow fivefold from the upper to the lower end.
ArrayXd stretched(double top_m, double bottom_m) {
    const double length = bottom_m - top_m;
    const auto n = static_cast<Index>(std::clamp(length / 0.010, 24.0, 72.0));
    constexpr double growth = 2.0;
    ArrayXd z(n + 1);
    for (Index i = 0; i <= n; ++i) {
        const double s = static_cast<double>(i) / static_cast<double>(n);
        z(i) = top_m + length * (s + growth * s * s) / (1.0 + growth);
    }
    return z;
}

/// A row of tridiagonal coefficients at every inner node.
struct Bands {
    ArrayXd below, at, above; // of nodes i - 1, i and i + 1
};

/// Bands of dT/dt.
template <class Value> Value apply(const Bands& a, Index i, Value up, Value here, Value down) {
    return a.below(i) * up + a.at(i) * here + a.above(i) * down;
}

/// Solves (1 - c A) y = right for the inner nodes.
class Solver {
public:
    Solver(const Bands& a, double c)
        : m_a{a}, m_c{c}, m_above(a.at.size()), m_inverse(a.at.size()) {
        for (Index i = 1; i + 1 < a.at.size(); ++i) {
            double pivot = 1.0 - c * a.at(i);
            if (i > 1)
                pivot += c * a.below(i) * m_above(i - 1);
            m_inverse(i) = 1.0 / pivot;
            m_above(i) = -c * a.above(i) * m_inverse(i);
        }
    }
    /// Right-hand sides in the columns 1 ... n - 2; the ends are left alone.
    void in_place(Eigen::Ref<ArrayXXd> y) const {
        const Index last = y.cols() - 2;
        y.col(1) *= m_inverse(1);
        for (Index i = 2; i <= last; ++i)
            y.col(i) = (y.col(i) + m_c * m_a.below(i) * y.col(i - 1)) * m_inverse(i);
        for (Index i = last - 1; i >= 1; --i)
            y.col(i) -= m_above(i) * y.col(i + 1);
    }

private:
    const Bands& m_a;
    double m_c;
    ArrayXd m_above, m_inverse;
};

} // namespace

/// Conductivity and capacity on the grid.
struct March::Medium {
    ArrayXd face_W_m_K, node_J_m3_K;
    Bands conduction;                // 1/s
    double unit_m_s = flux_unit_m_s; // flux of one unit of front
    ArrayXd carried;                 // rate for a flux of 1 m/s: below = +carried, above = -carried
};

/// Everything that changes while one pass goes through the segments.
struct March::Run {
    const Eigen::VectorXd& unknowns;
    const ArrayXd& weight;
    bool misfit_only;
    Medium medium;
    Normal out{};
    Bands bands{};
    ArrayXXd field{}, stage1{}, stage2{};    // 1 x nodes
    ArrayXXd change{}, change1{}, change2{}; // sensitivities x nodes
    std::vector<Index> index{};              // unknown of each sensitivity; -1: none
    std::vector<Index> slots{};              // first sensitivity of the knots: flux, top, bottom
    Index newest = -1;                       // newest knot that is active
    double flux_m_s = 0.0;
    Eigen::MatrixXd nodes_to_places{};       // weights, row = node, column = place
    Eigen::MatrixXd by_height{}, by_shift{}; // their derivatives
    ArrayXXd rows{};                         // waiting rows of the design, one a column
    ArrayXd rows_r{};                        // their residuals, weighted
    Index n_rows = 0;
};

March::March(const Profile& profile, const Layout& layout, double conductivity_W_m_K,
             double capacity_J_m3_K)
    : m_profile{profile}, m_layout{layout}, m_conductivity{conductivity_W_m_K},
      m_capacity{capacity_J_m3_K}, m_depth_m{stretched(profile.top_m, profile.bottom_m)} {
    const Index nodes = m_depth_m.size();
    m_layer_at_node.resize(layout.n_layer, nodes);
    m_layer_at_face.resize(layout.n_layer, nodes - 1);
    m_start_at_node = ArrayXXd::Zero(layout.n_start, nodes);
    for (Index i = 0; i < nodes; ++i) {
        m_layer_at_node.col(i) = layer_weights(m_depth_m(i));
        if (i + 1 < nodes)
            m_layer_at_face.col(i) = layer_weights(0.5 * (m_depth_m(i) + m_depth_m(i + 1)));
        if (i > 0 && i + 1 < nodes) // the ends are measured: one hat more on either side
            m_start_at_node.col(i) =
                hats(layout.n_start + 2, profile.top_m, profile.bottom_m, m_depth_m(i))
                    .segment(1, layout.n_start);
    }
    const double length = profile.bottom_m - profile.top_m;
    const double fade_s = length * length / (pi * pi * conductivity_W_m_K / capacity_J_m3_K);
    m_memory = std::min<Index>(layout.n_knot,
                               static_cast<Index>(std::ceil(3.5 * fade_s / layout.knot_s)) + 4);
}

ArrayXd March::layer_weights(double depth_m) const {
    return hats(m_layout.n_layer, m_profile.top_m, m_profile.bottom_m, depth_m);
}

March::Medium March::medium(const Eigen::VectorXd& unknowns) const {
    const Index nodes = m_depth_m.size(), n = m_layout.n_layer;
    Medium m;
    m.unit_m_s = flux_unit_m_s * std::exp(unknowns.segment(m_layout.capacity(), n).mean());
    const ArrayXXd lambda = unknowns.segment(m_layout.conductivity(), n).array().transpose();
    const ArrayXXd capacity = unknowns.segment(m_layout.capacity(), n).array().transpose();
    m.face_W_m_K =
        m_conductivity * (lambda.matrix() * m_layer_at_face.matrix()).transpose().array().exp();
    m.node_J_m3_K =
        m_capacity * (capacity.matrix() * m_layer_at_node.matrix()).transpose().array().exp();
    m.conduction.below = m.conduction.at = m.conduction.above = m.carried = ArrayXd::Zero(nodes);
    for (Index i = 1; i + 1 < nodes; ++i) {
        const double up = m_depth_m(i) - m_depth_m(i - 1), down = m_depth_m(i + 1) - m_depth_m(i);
        const double cell = 0.5 * (up + down) * m.node_J_m3_K(i);
        m.conduction.below(i) = m.face_W_m_K(i - 1) / (up * cell);
        m.conduction.above(i) = m.face_W_m_K(i) / (down * cell);
        m.conduction.at(i) = -m.conduction.below(i) - m.conduction.above(i);
        m.carried(i) = heat::water_heat_capacity_J_m3_K / (2.0 * cell);
    }
    return m;
}

Normal March::pass(const Eigen::VectorXd& unknowns, const ArrayXd& weight, bool misfit_only) const {
    const Index nodes = m_depth_m.size();
    Run run{unknowns, weight, misfit_only, medium(unknowns)};
    run.bands = run.medium.conduction;
    const bool blurred = m_layout.n_kernel > 0;
    const double height = blurred ? unknowns(m_layout.kernel()) : 0.0;
    const double shift = blurred ? unknowns(m_layout.kernel() + 1) : 0.0;
    run.nodes_to_places = weights_of_nodes(height, shift);
    if (blurred && !misfit_only) {
        constexpr double d = 0.02;
        run.by_height =
            (weights_of_nodes(height + d, shift) - weights_of_nodes(height - d, shift)) / (2.0 * d);
        run.by_shift =
            (weights_of_nodes(height, shift + d) - weights_of_nodes(height, shift - d)) / (2.0 * d);
    }
    run.field.resize(1, nodes);
    run.stage1 = run.stage2 = run.field;
    run.out.residual_K = ArrayXXd::Constant(m_profile.observed_degC.rows(), m_layout.n_place,
                                            std::numeric_limits<double>::quiet_NaN());
    if (!misfit_only) {
        const Index globals = 2 * m_layout.n_layer + m_layout.n_start;
        const Index n = globals + 3 * m_memory;
        run.change.resize(n, nodes);
        run.change1 = run.change2 = run.change;
        run.slots = {globals, globals + m_memory, globals + 2 * m_memory};
        run.index.assign(static_cast<std::size_t>(n + m_layout.n_place + m_layout.n_kernel), -1);
        run.rows.resize(n + m_layout.n_place + m_layout.n_kernel, 256);
        run.rows_r.resize(256);
        run.out.hessian = Eigen::MatrixXd::Zero(m_layout.size(), m_layout.size());
        run.out.gradient = Eigen::VectorXd::Zero(m_layout.size());
    }
    for (Index s = 0; s < m_layout.n_segment; ++s)
        march_segment(run, s);
    if (!misfit_only)
        flush(run);
    return run.out;
}

void March::start(Run& run, Index i_segment) const {
    const Segment& segment = m_profile.segments[static_cast<std::size_t>(i_segment)];
    const Index nodes = m_depth_m.size(), row = segment.first;
    // The first measured profile, straight between the places that have a value.
    std::vector<double> z{m_profile.top_m}, t{m_profile.top_degC(row)};
    for (Index j = 0; j < m_profile.depth_m.size(); ++j)
        if (!std::isnan(m_profile.observed_degC(row, j))) {
            z.push_back(m_profile.depth_m(j));
            t.push_back(m_profile.observed_degC(row, j));
        }
    z.push_back(m_profile.bottom_m);
    t.push_back(m_profile.bottom_degC(row));
    std::size_t k = 0;
    const auto free =
        run.unknowns.segment(m_layout.starts() + i_segment * m_layout.n_start, m_layout.n_start);
    for (Index i = 0; i < nodes; ++i) {
        while (k + 2 < z.size() && m_depth_m(i) > z[k + 1])
            ++k;
        const double w = (m_depth_m(i) - z[k]) / (z[k + 1] - z[k]);
        run.field(0, i) =
            (1.0 - w) * t[k] + w * t[k + 1] + free.dot(m_start_at_node.col(i).matrix());
    }
    if (run.misfit_only)
        return;
    flush(run);
    run.change.setZero();
    std::fill(run.index.begin(), run.index.end(), -1);
    for (Index g = 0; g < 2 * m_layout.n_layer; ++g)
        run.index[static_cast<std::size_t>(g)] = g;
    for (Index g = 0; g < m_layout.n_start; ++g) {
        const Index slot = 2 * m_layout.n_layer + g;
        run.index[static_cast<std::size_t>(slot)] =
            m_layout.starts() + i_segment * m_layout.n_start + g;
        run.change.row(slot) = m_start_at_node.row(g);
    }
    for (Index j = 0; j < m_layout.n_place; ++j)
        run.index[static_cast<std::size_t>(run.change.rows() + j)] = m_layout.offsets() + j;
    for (Index g = 0; g < m_layout.n_kernel; ++g)
        run.index[static_cast<std::size_t>(run.change.rows() + m_layout.n_place + g)] =
            m_layout.kernel() + g;
    const double s = (m_profile.time_s(row) - m_layout.first_knot_s) / m_layout.knot_s;
    run.newest = static_cast<Index>(std::floor(s)) - 1;
}

/// Lets the knots whose hats begin before a time take part; the oldest make way.
void March::activate(Run& run, double time_s) const {
    const double s = (time_s - m_layout.first_knot_s) / m_layout.knot_s;
    const auto wanted = std::min(static_cast<Index>(std::floor(s)) + 1, m_layout.n_knot - 1);
    while (run.newest < wanted) {
        flush(run);
        ++run.newest;
        if (run.newest < 0)
            continue;
        const std::array<Index, 3> group_first{m_layout.flux(), m_layout.top(), m_layout.bottom()};
        for (std::size_t g = 0; g < 3; ++g) {
            const Index slot = run.slots[g] + run.newest % m_memory;
            run.index[static_cast<std::size_t>(slot)] = group_first[g] + run.newest;
            run.change.row(slot).setZero();
        }
    }
}

void March::march_segment(Run& run, Index i_segment) const {
    const Segment& segment = m_profile.segments[static_cast<std::size_t>(i_segment)];
    start(run, i_segment);
    if (!run.misfit_only)
        activate(run, m_profile.time_s(segment.first));
    for (Index row = segment.first; row + 1 < segment.first + segment.count; ++row) {
        if (!run.misfit_only)
            activate(run, m_profile.time_s(row + 1));
        step(run, row);
        if (!run.misfit_only)
            step_sensitivity(run, row);
        run.field = run.stage2;
        const double since_s = m_profile.time_s(row + 1) - m_profile.time_s(segment.first);
        const double all_s = m_profile.step_s * static_cast<double>(segment.count);
        if (since_s >= std::min(m_profile.settle_s, 0.1 * all_s))
            observe(run, row + 1);
    }
}

namespace {

/// The two knots around a time and the share of the later one.
struct Between {
    Index knot = 0;
    double later = 0.0;
};
Between between(const Layout& layout, double time_s) {
    const double s = std::clamp((time_s - layout.first_knot_s) / layout.knot_s, 0.0,
                                static_cast<double>(layout.n_knot - 1));
    const auto k = std::min(static_cast<Index>(s), std::max<Index>(layout.n_knot - 2, 0));
    return {k, s - static_cast<double>(k)};
}

double at(const Eigen::VectorXd& unknowns, Index first, const Between& b) {
    return (1.0 - b.later) * unknowns(first + b.knot) + b.later * unknowns(first + b.knot + 1);
}

} // namespace

void March::step(Run& run, Index row) const {
    const double dt = m_profile.step_s, t = m_profile.time_s(row);
    const Medium& m = run.medium;
    run.flux_m_s =
        run.medium.unit_m_s * at(run.unknowns, m_layout.flux(), between(m_layout, t + 0.5 * dt));
    run.bands.below = m.conduction.below + run.flux_m_s * m.carried;
    run.bands.above = m.conduction.above - run.flux_m_s * m.carried;
    const Solver solver{run.bands, gamma * dt};
    const Index last = m_depth_m.size() - 1;
    const auto boundary = [&](ArrayXXd& stage, double share) {
        const Between b = between(m_layout, t + share * dt);
        stage(0, 0) = (1.0 - share) * m_profile.top_degC(row) +
                      share * m_profile.top_degC(row + 1) + at(run.unknowns, m_layout.top(), b);
        stage(0, last) = (1.0 - share) * m_profile.bottom_degC(row) +
                         share * m_profile.bottom_degC(row + 1) +
                         at(run.unknowns, m_layout.bottom(), b);
        stage.col(1) += gamma * dt * run.bands.below(1) * stage(0, 0);
        stage.col(last - 1) += gamma * dt * run.bands.above(last - 1) * stage(0, last);
    };
    constexpr double blend = (1.0 - gamma) / gamma;
    run.stage1 = run.field;
    boundary(run.stage1, gamma);
    solver.in_place(run.stage1);
    run.stage2 = run.field + blend * (run.stage1 - run.field);
    boundary(run.stage2, 1.0);
    solver.in_place(run.stage2);
}

void March::step_sensitivity(Run& run, Index row) const {
    const double dt = m_profile.step_s, t = m_profile.time_s(row);
    const Index last = m_depth_m.size() - 1, n_layer = m_layout.n_layer;
    const Medium& m = run.medium;
    const Solver solver{run.bands, gamma * dt};
    // What the unknowns themselves add at given temperatures, beside what they have changed so far.
    const auto source = [&](ArrayXXd& right, const ArrayXXd& field, double share) {
        right.col(0).setZero();
        right.col(last).setZero();
        const double c = gamma * dt;
        const Between mid = between(m_layout, t + 0.5 * dt);
        const Between b = between(m_layout, t + share * dt);
        const Index slot0 = run.slots[0] + mid.knot % m_memory;
        const Index slot1 = run.slots[0] + (mid.knot + 1) % m_memory;
        for (Index i = 1; i < last; ++i) {
            const double from_above = m.conduction.below(i) * (field(0, i - 1) - field(0, i));
            const double from_below = m.conduction.above(i) * (field(0, i + 1) - field(0, i));
            const double carried = m.carried(i) * (field(0, i - 1) - field(0, i + 1));
            right.col(i).segment(0, n_layer) +=
                c * (from_above * m_layer_at_face.col(i - 1) + from_below * m_layer_at_face.col(i));
            right.col(i).segment(n_layer, n_layer) -=
                c * (from_above + from_below + run.flux_m_s * carried) * m_layer_at_node.col(i);
            right.col(i).segment(n_layer, n_layer) +=
                c * run.flux_m_s * carried / static_cast<double>(n_layer);
            right(slot0, i) += c * m.unit_m_s * (1.0 - mid.later) * carried;
            right(slot1, i) += c * m.unit_m_s * mid.later * carried;
        }
        for (const bool low : {false, true}) {
            const Index i = low ? last - 1 : 1;
            const double a = c * (low ? run.bands.above(i) : run.bands.below(i));
            const Index first = run.slots[low ? 2 : 1];
            right(first + b.knot % m_memory, i) += a * (1.0 - b.later);
            right(first + (b.knot + 1) % m_memory, i) += a * b.later;
        }
    };
    constexpr double blend = (1.0 - gamma) / gamma;
    run.change1 = run.change;
    source(run.change1, run.stage1, gamma);
    solver.in_place(run.change1);
    run.change2 = run.change + blend * (run.change1 - run.change);
    source(run.change2, run.stage2, 1.0);
    solver.in_place(run.change2);
    run.change.swap(run.change2);
    run.change.col(0).setZero();
    run.change.col(last).setZero();
    const Between end = between(m_layout, t + dt);
    for (const bool low : {false, true}) {
        const Index i = low ? last : 0, first = run.slots[low ? 2 : 1];
        run.change(first + end.knot % m_memory, i) = 1.0 - end.later;
        run.change(first + (end.knot + 1) % m_memory, i) = end.later;
    }
}

void March::observe(Run& run, Index row) const {
    const Eigen::RowVectorXd field = run.field.matrix();
    const Eigen::RowVectorXd modelled = field * run.nodes_to_places;
    Eigen::MatrixXd design;
    Eigen::RowVectorXd by_height, by_shift;
    if (!run.misfit_only) {
        design = run.change.matrix() * run.nodes_to_places;
        if (m_layout.n_kernel > 0) {
            by_height = field * run.by_height;
            by_shift = field * run.by_shift;
        }
    }
    for (Index j = 0; j < m_layout.n_place; ++j) {
        const double seen = m_profile.observed_degC(row, j);
        if (std::isnan(seen))
            continue;
        const double residual = seen - modelled(j) - run.unknowns(m_layout.offsets() + j);
        run.out.residual_K(row, j) = residual;
        run.out.misfit += run.weight(j) * residual * residual;
        if (run.misfit_only)
            continue;
        const double root = std::sqrt(run.weight(j));
        const Index n = run.change.rows();
        auto into = run.rows.col(run.n_rows);
        into.setZero();
        into.head(n) = root * design.col(j).array();
        into(n + j) = root;
        if (m_layout.n_kernel > 0) {
            into(n + m_layout.n_place) = root * by_height(j);
            into(n + m_layout.n_place + 1) = root * by_shift(j);
        }
        run.rows_r(run.n_rows++) = root * residual;
        if (run.n_rows == run.rows.cols())
            flush(run);
    }
}

Eigen::MatrixXd March::weights_of_nodes(double log_height, double shift_cm) const {
    const Index nodes = m_depth_m.size(), n = m_profile.depth_m.size();
    Eigen::MatrixXd w = Eigen::MatrixXd::Zero(nodes, n);
    // Cubic through the four nodes around a depth; beyond the boundaries their own temperature.
    const auto add = [&](Index j, double z, double share) {
        if (z <= m_depth_m(0) || z >= m_depth_m(nodes - 1)) {
            w(z <= m_depth_m(0) ? 0 : nodes - 1, j) += share;
            return;
        }
        const double* begin = m_depth_m.data();
        const auto next = static_cast<Index>(std::upper_bound(begin, begin + nodes, z) - begin);
        const Index first = std::clamp<Index>(next - 2, 0, nodes - 4);
        for (Index a = 0; a < 4; ++a) {
            double part = share;
            for (Index b = 0; b < 4; ++b)
                if (b != a)
                    part *=
                        (z - m_depth_m(first + b)) / (m_depth_m(first + a) - m_depth_m(first + b));
            w(first + a, j) += part;
        }
    };
    if (m_layout.n_kernel == 0) {
        for (Index j = 0; j < n; ++j)
            add(j, m_profile.depth_m(j), 1.0);
        return w;
    }
    const double sigma_m = m_profile.averaging_m * std::exp(log_height) / 2.354820045;
    constexpr int points = 16;
    double sum = 0.0;
    for (int i = -points; i <= points; ++i)
        sum += std::exp(-0.5 * std::pow(3.2 * i / points, 2));
    for (Index j = 0; j < n; ++j)
        for (int i = -points; i <= points; ++i) {
            const double s = 3.2 * i / points;
            add(j, m_profile.depth_m(j) + 0.01 * shift_cm + s * sigma_m,
                std::exp(-0.5 * s * s) / sum);
        }
    return w;
}

/// Adds the waiting rows to the normal equations.
void March::flush(Run& run) const {
    if (run.n_rows == 0)
        return;
    const auto rows = run.rows.leftCols(run.n_rows).matrix();
    const Eigen::MatrixXd square = rows * rows.transpose();
    const Eigen::VectorXd right = rows * run.rows_r.head(run.n_rows).matrix();
    const auto n = static_cast<Index>(run.index.size());
    for (Index b = 0; b < n; ++b) {
        const Index at_b = run.index[static_cast<std::size_t>(b)];
        if (at_b < 0)
            continue;
        run.out.gradient(at_b) += right(b);
        for (Index a = 0; a < n; ++a) {
            const Index at_a = run.index[static_cast<std::size_t>(a)];
            if (at_a >= 0)
                run.out.hessian(at_a, at_b) += square(a, b);
        }
    }
    run.n_rows = 0;
}

} // namespace rillstrand::bed

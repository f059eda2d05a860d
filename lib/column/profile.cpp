// SPDX-License-Identifier: Apache-2.0
#include "column/profile.hpp"

#include <Eigen/SparseCholesky>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <vector>

namespace rillstrand::column {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

using Sparse = Eigen::SparseMatrix<double>;
using Cholesky = Eigen::SimplicialLLT<Sparse, Eigen::Lower, Eigen::NaturalOrdering<int>>;

/// Weights of the grid's nodes in the reading at a depth: a Gaussian cut at three sd and at the
/// grid's ends; straight between two nodes where the kernel is narrower than the grid.
void add_row(std::vector<Eigen::Triplet<double>>& weights, int row, double depth_m, double kernel_m,
             double step_m, Eigen::Index nodes) {
    if (kernel_m < 0.5 * step_m) {
        const double at = std::clamp(depth_m / step_m, 0.0, static_cast<double>(nodes - 1));
        const auto k = std::min<Eigen::Index>(static_cast<Eigen::Index>(at), nodes - 2);
        const double w = at - static_cast<double>(k);
        weights.emplace_back(row, static_cast<int>(k), 1.0 - w);
        weights.emplace_back(row, static_cast<int>(k + 1), w);
        return;
    }
    const auto first = std::max<Eigen::Index>(0, std::lround((depth_m - 3.0 * kernel_m) / step_m));
    const auto last =
        std::min<Eigen::Index>(nodes - 1, std::lround((depth_m + 3.0 * kernel_m) / step_m));
    double sum = 0.0;
    std::vector<double> w;
    for (Eigen::Index k = first; k <= last; ++k) {
        const double off = (static_cast<double>(k) * step_m - depth_m) / kernel_m;
        w.push_back(std::exp(-0.5 * off * off));
        sum += w.back();
    }
    for (Eigen::Index k = first; k <= last; ++k)
        weights.emplace_back(row, static_cast<int>(k),
                             w[static_cast<std::size_t>(k - first)] / sum);
}

/// Second differences of the grid, (nodes - 2) x nodes.
Sparse second_differences(Eigen::Index nodes) {
    std::vector<Eigen::Triplet<double>> entries;
    for (int i = 0; i + 2 < static_cast<int>(nodes); ++i) {
        entries.emplace_back(i, i, 1.0);
        entries.emplace_back(i, i + 1, -2.0);
        entries.emplace_back(i, i + 2, 1.0);
    }
    Sparse d(nodes - 2, nodes);
    d.setFromTriplets(entries.begin(), entries.end());
    return d;
}

struct Solution {
    Eigen::VectorXd mean;
    double log_likelihood = -std::numeric_limits<double>::infinity();
};

/// The normal equations of one instant; the stiffness varies.
class Problem {
public:
    Problem(const Readings& readings, double step_m, Eigen::Index nodes)
        : m_step_m{step_m}, m_differences{second_differences(nodes)} {
        std::vector<Eigen::Triplet<double>> weights;
        std::vector<double> value, precision;
        for (Eigen::Index j = 0; j < readings.depth_m.size(); ++j) {
            if (std::isnan(readings.value_degC(j)))
                continue;
            add_row(weights, static_cast<int>(value.size()), readings.depth_m(j),
                    readings.kernel_sd_m, step_m, nodes);
            value.push_back(readings.value_degC(j));
            precision.push_back(1.0 / (readings.sd_K(j) * readings.sd_K(j)));
        }
        const auto n = static_cast<Eigen::Index>(value.size());
        Sparse h(n, nodes);
        h.setFromTriplets(weights.begin(), weights.end());
        const Eigen::Map<const Eigen::VectorXd> y{value.data(), n}, r{precision.data(), n};
        m_information = h.transpose() * r.asDiagonal() * h;
        m_right = h.transpose() * r.cwiseProduct(y);
        m_square = y.cwiseProduct(r).dot(y);
    }

    /// @param walk_variance  of the slope over a metre at each inner node
    Solution solve(const Eigen::ArrayXd& walk_variance) {
        const Eigen::VectorXd weight =
            (1.0 / (walk_variance * m_step_m * m_step_m * m_step_m)).matrix();
        const Sparse precision =
            m_information + Sparse(m_differences.transpose() * weight.asDiagonal() * m_differences);
        if (!m_analysed)
            m_cholesky.analyzePattern(precision);
        m_analysed = true;
        m_cholesky.factorize(precision);
        Solution found;
        if (m_cholesky.info() != Eigen::Success)
            return found;
        found.mean = m_cholesky.solve(m_right);
        double log_determinant = 0.0;
        const Sparse lower = m_cholesky.matrixL();
        for (Eigen::Index i = 0; i < lower.cols(); ++i)
            log_determinant += 2.0 * std::log(lower.coeff(i, i));
        found.log_likelihood = 0.5 * (weight.array().log().sum() - log_determinant -
                                      (m_square - m_right.dot(found.mean)));
        return found;
    }

    /// Departures from the mean that the data allow, at the last solved stiffness.
    Eigen::MatrixXd draw(Eigen::Index nodes, int draws, std::mt19937_64& random) const {
        std::normal_distribution<double> normal;
        Eigen::MatrixXd white(nodes, draws);
        for (Eigen::Index c = 0; c < draws; ++c)
            for (Eigen::Index i = 0; i < nodes; ++i)
                white(i, c) = normal(random);
        return m_cholesky.matrixU().solve(white);
    }

private:
    double m_step_m;
    Sparse m_differences, m_information;
    Eigen::VectorXd m_right;
    double m_square = 0.0;
    Cholesky m_cholesky;
    bool m_analysed = false;
};

/// Mean square of the second derivative around each inner node, over the scale of the readings.
Eigen::ArrayXd local_curvature(const Eigen::VectorXd& mean, double step_m, double scale_m) {
    const Eigen::Index n = mean.size() - 2;
    const Eigen::ArrayXd bend =
        ((mean.head(n) - 2.0 * mean.segment(1, n) + mean.tail(n)) / (step_m * step_m))
            .array()
            .square();
    const auto half = std::max<Eigen::Index>(1, std::lround(0.5 * scale_m / step_m));
    Eigen::ArrayXd smooth(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        const Eigen::Index from = std::max<Eigen::Index>(0, i - half),
                           to = std::min(n - 1, i + half);
        smooth(i) = bend.segment(from, to - from + 1).mean();
    }
    return smooth;
}

} // namespace

ProfileFitter::ProfileFitter(double bottom_m, int draws) : m_draws{draws} {
    // A step that divides the half scale of gradients; coarser where the column is deep.
    m_step_m = bottom_m <= 25.0 ? 0.05 : (bottom_m <= 60.0 ? 0.125 : 0.25);
    m_nodes =
        std::max<Eigen::Index>(4, static_cast<Eigen::Index>(std::ceil(bottom_m / m_step_m)) + 1);
}

FittedProfile ProfileFitter::fit(const Readings& readings, std::mt19937_64& random) const {
    const Eigen::Index n = m_nodes;
    FittedProfile out;
    out.depth_m = Eigen::ArrayXd::LinSpaced(n, 0.0, m_step_m * static_cast<double>(n - 1));
    out.mean_degC = out.sd_K = Eigen::ArrayXd::Constant(n, nan);
    const Eigen::Index known = (!readings.value_degC.isNaN()).count();
    if (known < 3)
        return out;
    Problem problem{readings, m_step_m, n};
    Solution best;
    double best_walk = 1.0;
    for (double log_walk = -3.0; log_walk < 3.6; log_walk += 0.5) {
        const double walk = std::pow(10.0, 2.0 * log_walk);
        const Solution here = problem.solve(Eigen::ArrayXd::Constant(n - 2, walk));
        if (here.log_likelihood > best.log_likelihood) {
            best = here;
            best_walk = walk;
        }
    }
    if (best.mean.size() == 0)
        return out;
    const double span_m = readings.depth_m.maxCoeff() - readings.depth_m.minCoeff();
    const double spacing_m = span_m / static_cast<double>(std::max<Eigen::Index>(1, known - 1));
    const double scale_m = std::max({0.4, 3.0 * spacing_m, 2.0 * readings.kernel_sd_m});
    const Eigen::ArrayXd curvature = local_curvature(best.mean, m_step_m, scale_m);
    const double floor = 1e-3 * curvature.mean() + 1e-12;
    Eigen::ArrayXd best_variance = Eigen::ArrayXd::Constant(n - 2, best_walk);
    Solution adapted = best;
    for (const double times : {0.1, 0.3, 1.0, 3.0, 10.0}) {
        const Eigen::ArrayXd variance = times * scale_m * (curvature + floor);
        const Solution here = problem.solve(variance);
        if (here.log_likelihood > adapted.log_likelihood) {
            adapted = here;
            best_variance = variance;
        }
    }
    adapted = problem.solve(best_variance);
    out.mean_degC = adapted.mean.array();
    out.draws_degC = problem.draw(n, m_draws, random).array().colwise() + out.mean_degC;
    out.sd_K = ((out.draws_degC.colwise() - out.mean_degC).square().rowwise().sum() /
                static_cast<double>(m_draws))
                   .sqrt();
    return out;
}

} // namespace rillstrand::column

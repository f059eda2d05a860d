// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <vector>

namespace rillstrand::stats {

/// Few places that stand for many queries along a path.
///
/// Between two observations the smoothed mean of a path whose rate wanders is a cubic of the place
/// and its variance a polynomial of sixth degree, whatever the size of the walks; an average over
/// sizes stays one. Seven places of a piece so give all others, up to rounding.
class DensePath {
public:
    /// @param at     places of the observations, increasing
    /// @param query  increasing, at least one
    DensePath(const Eigen::ArrayXd& at, const Eigen::ArrayXd& query);
    /// Where to evaluate: increasing; the queries themselves where they are few.
    const Eigen::ArrayXd& nodes() const { return m_nodes; }
    /// Values at the queries from the values at nodes().
    Eigen::ArrayXd at_queries(const Eigen::ArrayXd& at_nodes) const;

private:
    struct Piece {
        Eigen::Index first_query, queries;
        Eigen::Index first_node, nodes; ///< as many as queries: the queries themselves
    };
    void add_piece(Eigen::Index first_query, Eigen::Index queries, std::vector<double>& nodes);
    Eigen::ArrayXd m_query;
    Eigen::ArrayXd m_nodes;
    std::vector<Piece> m_pieces;
};

} // namespace rillstrand::stats

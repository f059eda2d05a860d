// SPDX-License-Identifier: Apache-2.0
#include "stats/path_dense.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace rillstrand::stats {

namespace {

constexpr Eigen::Index piece_nodes = 7; // a polynomial of sixth degree

/// Weights of the barycentric formula at Chebyshev points of the second kind.
/// Source: Berrut and Trefethen (2004), SIAM Rev. 46, 501-517, doi:10.1137/S0036144502417715.
constexpr std::array<double, 7> weights{0.5, -1.0, 1.0, -1.0, 1.0, -1.0, 0.5};

double interpolated(const double* node, const double* value, double at) {
    double above = 0.0, below = 0.0;
    for (std::size_t k = 0; k < weights.size(); ++k) {
        const double apart = at - node[k];
        if (apart == 0.0)
            return value[k];
        const double part = weights[k] / apart;
        above += part * value[k];
        below += part;
    }
    return above / below;
}

} // namespace

DensePath::DensePath(const Eigen::ArrayXd& at, const Eigen::ArrayXd& query) : m_query{query} {
    std::vector<double> nodes;
    const double* begin = query.data();
    const double* end = begin + query.size();
    const double* from = begin;
    for (Eigen::Index i = 0; i <= at.size() && from != end; ++i) {
        const double* to = i < at.size() ? std::lower_bound(from, end, at(i)) : end;
        if (to != from)
            add_piece(from - begin, to - from, nodes);
        from = to;
    }
    m_nodes =
        Eigen::Map<const Eigen::ArrayXd>(nodes.data(), static_cast<Eigen::Index>(nodes.size()));
}

void DensePath::add_piece(Eigen::Index first_query, Eigen::Index queries,
                          std::vector<double>& nodes) {
    const double from = m_query(first_query), to = m_query(first_query + queries - 1);
    Piece piece{first_query, queries, static_cast<Eigen::Index>(nodes.size()), queries};
    if (queries <= piece_nodes || !(to - from > 0.0)) {
        for (Eigen::Index k = 0; k < queries; ++k)
            nodes.push_back(m_query(first_query + k));
    } else {
        piece.nodes = piece_nodes;
        for (Eigen::Index k = 0; k < piece_nodes; ++k) {
            const double angle =
                std::numbers::pi * static_cast<double>(k) / static_cast<double>(piece_nodes - 1);
            nodes.push_back(0.5 * (from + to) - 0.5 * (to - from) * std::cos(angle));
        }
        nodes.back() = to;
    }
    m_pieces.push_back(piece);
}

Eigen::ArrayXd DensePath::at_queries(const Eigen::ArrayXd& at_nodes) const {
    Eigen::ArrayXd values(m_query.size());
    for (const Piece& piece : m_pieces) {
        if (piece.nodes == piece.queries) {
            values.segment(piece.first_query, piece.queries) =
                at_nodes.segment(piece.first_node, piece.nodes);
            continue;
        }
        const double* node = m_nodes.data() + piece.first_node;
        const double* value = at_nodes.data() + piece.first_node;
        for (Eigen::Index k = piece.first_query; k < piece.first_query + piece.queries; ++k)
            values(k) = interpolated(node, value, m_query(k));
    }
    return values;
}

} // namespace rillstrand::stats

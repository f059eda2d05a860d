// SPDX-License-Identifier: Apache-2.0
#include "stream/scan.hpp"

#include "stream/scan_parts.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {

constexpr std::array<double, 2> slow_mixing_m{6.0, 20.0};

/// Whitened shapes at every boundary between channels, and what they would gain.
class Shapes {
public:
    Shapes(const Eigen::ArrayXd& place_m, const Whitener& whitener, double response_sd_m,
           const ScanLevels& levels)
        : m_place(place_m), m_levels(levels) {
        const Eigen::Index n = place_m.size();
        const double spacing = (place_m[n - 1] - place_m[0]) / double(n - 1);
        m_lead = static_cast<Eigen::Index>(std::ceil(3.0 * response_sd_m / spacing)) + 1;
        m_band =
            std::min<Eigen::Index>(n, static_cast<Eigen::Index>(levels.reach_m / spacing) + m_lead);
        for (std::size_t f = 0; f < families; ++f) {
            m_white[f] = Eigen::MatrixXd::Zero(m_band, n);
            m_norm2[f] = Eigen::ArrayXd::Zero(n);
        }
        Eigen::ArrayXd shape(m_band);
        for (Eigen::Index j = 1; j < n; ++j) {
            const double at = boundary(j);
            const Eigen::Index first = start(j), length = span(j);
            for (std::size_t f = 0; f < families; ++f) {
                for (Eigen::Index k = 0; k < length; ++k)
                    shape[k] = shape_value(f, place_m[first + k] - at, response_sd_m);
                whitener.apply_from(first, shape.head(length), m_white[f].col(j).head(length));
                m_norm2[f][j] = m_white[f].col(j).squaredNorm();
            }
        }
        m_full2 = m_norm2;
        make_widths(spacing);
        m_spacing = spacing;
    }

    struct Best {
        double gain = 0.0; ///< beyond its level
        double z = 0.0;
        Piece piece;
    };

    /// As if nothing had been accepted.
    void reset() {
        m_norm2 = m_full2;
        m_box2 = m_box_full2;
    }

    /// The shape that gains most.
    Best best(const Eigen::VectorXd& residual, double widest_m) {
        for (std::size_t f = 0; f < families; ++f) {
            m_dot[f] = Eigen::ArrayXd::Zero(m_place.size());
            for (Eigen::Index j = 1; j < m_place.size(); ++j)
                m_dot[f][j] =
                    m_white[f].col(j).head(span(j)).dot(residual.segment(start(j), span(j)));
        }
        Best top;
        top.gain = 0.0;
        best_single(top);
        best_box(top, widest_m);
        return top;
    }

    /// A new orthonormal column of the fit takes its part of every shape.
    void accept(const Eigen::VectorXd& q) {
        Eigen::ArrayXd step_part = Eigen::ArrayXd::Zero(m_place.size());
        for (std::size_t f = 0; f < families; ++f)
            for (Eigen::Index j = 1; j < m_place.size(); ++j) {
                const double p = m_white[f].col(j).head(span(j)).dot(q.segment(start(j), span(j)));
                m_norm2[f][j] -= p * p;
                if (f == 0)
                    step_part[j] = p;
            }
        for (std::size_t w = 0; w < m_width.size(); ++w)
            for (Eigen::Index j = 1; j + m_width[w] < m_place.size(); ++j) {
                const double p = step_part[j] - step_part[j + m_width[w]];
                m_box2(j, static_cast<Eigen::Index>(w)) -= p * p;
            }
    }

private:
    static constexpr std::size_t families = 4; // step, two slow steps, kink

    static double shape_value(std::size_t family, double x, double sd) {
        if (family == 0)
            return seen_step(x, sd);
        if (family < 3)
            return seen_step(x, sd) - seen_plume(x, slow_mixing_m[family - 1], sd);
        return std::max(0.0, x);
    }
    double boundary(Eigen::Index j) const { return 0.5 * (m_place[j - 1] + m_place[j]); }
    Eigen::Index start(Eigen::Index j) const { return std::max<Eigen::Index>(0, j - m_lead); }
    Eigen::Index span(Eigen::Index j) const { return std::min(m_band, m_place.size() - start(j)); }

    void make_widths(double spacing) {
        for (double w = 1.0; w * spacing <= m_levels.widest_box_m; w = std::max(w + 1.0, w * 1.25))
            m_width.push_back(static_cast<Eigen::Index>(w));
        const Eigen::Index n = m_place.size();
        m_box2 = Eigen::ArrayXXd::Zero(n, static_cast<Eigen::Index>(m_width.size()));
        for (std::size_t w = 0; w < m_width.size(); ++w)
            for (Eigen::Index j = 1; j + m_width[w] < n; ++j) {
                const Eigen::Index other = j + m_width[w];
                const Eigen::Index shift = start(other) - start(j);
                const Eigen::Index common =
                    std::max<Eigen::Index>(0, std::min(span(j) - shift, span(other)));
                double cross = 0.0;
                if (common > 0)
                    cross = m_white[0]
                                .col(j)
                                .segment(shift, common)
                                .dot(m_white[0].col(other).head(common));
                m_box2(j, static_cast<Eigen::Index>(w)) =
                    m_norm2[0][j] + m_norm2[0][other] - 2.0 * cross;
            }
        m_box_full2 = m_box2;
    }

    void best_single(Best& top) const {
        for (std::size_t f = 0; f < families; ++f)
            for (Eigen::Index j = 2; j + 2 < m_place.size(); ++j) {
                // what lies within the pieces there are is not looked for again
                if (m_norm2[f][j] < 0.03 * m_full2[f][j] || m_full2[f][j] <= 0.0)
                    continue;
                const double gain = m_dot[f][j] * m_dot[f][j] / m_norm2[f][j];
                double level = m_levels.kink_gain;
                if (f < 3)
                    level = (m_dot[f][j] > 0.0 ? m_levels.step_gain : m_levels.fall_gain) +
                            (f > 0 ? 3.0 : 0.0);
                if (gain - level > top.gain) {
                    top.gain = gain - level;
                    top.z = std::sqrt(gain);
                    top.piece = Piece{};
                    top.piece.at_m = boundary(j);
                    top.piece.type = f == 3 ? Piece::Type::kink : Piece::Type::step;
                    top.piece.mixing_m = f == 1 || f == 2 ? slow_mixing_m[f - 1] : 0.0;
                    top.piece.score = top.z;
                }
            }
    }

    void best_box(Best& top, double widest_m) const {
        for (std::size_t w = 0; w < m_width.size() && double(m_width[w]) * m_spacing <= widest_m;
             ++w)
            for (Eigen::Index j = 1; j + m_width[w] < m_place.size(); ++j) {
                const auto i = static_cast<Eigen::Index>(w);
                if (m_box2(j, i) < 0.03 * m_box_full2(j, i) || m_box_full2(j, i) <= 0.0)
                    continue;
                const double dot = m_dot[0][j] - m_dot[0][j + m_width[w]];
                const double gain = dot * dot / m_box2(j, i);
                if (gain - m_levels.box_gain > top.gain) {
                    top.gain = gain - m_levels.box_gain;
                    top.z = std::sqrt(gain);
                    top.piece = Piece{};
                    top.piece.type = Piece::Type::box;
                    top.piece.at_m = boundary(j);
                    top.piece.to_m = boundary(j + m_width[w]);
                    top.piece.score = top.z;
                }
            }
    }

    Eigen::ArrayXd m_place;
    ScanLevels m_levels;
    Eigen::Index m_lead = 0, m_band = 0;
    double m_spacing = 1.0;
    std::array<Eigen::MatrixXd, families> m_white;
    std::array<Eigen::ArrayXd, families> m_norm2, m_full2, m_dot;
    std::vector<Eigen::Index> m_width;
    Eigen::ArrayXXd m_box2, m_box_full2;
};

void take_in(const Piece& piece, const LocalFit& fit, Basis& basis, Shapes& shapes) {
    for (const Eigen::VectorXd& column : fit.columns(piece)) {
        if (basis.add(column))
            shapes.accept(basis.last());
    }
}

} // namespace

double maximum_z(double count, double family) {
    const double tail = -std::log1p(-family) / std::max(1.0, count);
    double low = 0.0, high = 12.0;
    for (int i = 0; i < 60; ++i) {
        const double z = 0.5 * (low + high);
        (0.5 * std::erfc(z / std::sqrt(2.0)) > tail ? low : high) = z;
    }
    return 0.5 * (low + high);
}

ScanLevels make_levels(const Eigen::ArrayXd& place_m, double response_sd_m, double family) {
    const Eigen::Index n = place_m.size();
    const double independent =
        std::min(double(n), (place_m[n - 1] - place_m[0]) / (1.18 * response_sd_m));
    const double z = maximum_z(3.0 * independent, family);
    ScanLevels levels;
    levels.step_gain = z * z;
    levels.fall_gain = z * z;
    levels.box_gain = z * z + 2.0;
    levels.kink_gain = z * z - 2.0;
    return levels;
}

std::vector<Piece> find_pieces(const Eigen::ArrayXd& place_m, const Eigen::ArrayXd& profile,
                               const Eigen::ArrayXd& variance, double roughness2,
                               double response_sd_m, const ScanLevels& levels,
                               std::vector<Piece> start) {
    const Whitener whitener(place_m, variance, roughness2);
    const Eigen::VectorXd white = whitener.apply(profile);
    Shapes shapes(place_m, whitener, response_sd_m, levels);
    std::vector<Piece> best;
    double least = std::numeric_limits<double>::infinity();
    // one by one may take a wrong turn where things lie close: three ways, the best end counts
    for (const double widest_m : {levels.widest_box_m, 0.4 * levels.widest_box_m, 2.5}) {
        const LocalFit fit(place_m, whitener, response_sd_m, levels);
        shapes.reset();
        Basis basis(white);
        std::vector<Piece> pieces = start;
        for (const Piece& piece : pieces)
            take_in(piece, fit, basis, shapes);
        while (pieces.size() < levels.most_pieces) {
            const Shapes::Best top = shapes.best(basis.residual(), widest_m);
            if (!(top.gain > 0.0))
                break;
            const Piece piece = fit.improve(top.piece, basis);
            take_in(piece, fit, basis, shapes);
            pieces.push_back(piece);
        }
        pieces = fit.settle(std::move(pieces), white);
        const double cost = fit.cost(pieces, white);
        if (cost < least) {
            least = cost;
            best = std::move(pieces);
        }
    }
    return best;
}

Eigen::ArrayXd step_sd(const Eigen::ArrayXd& place_m, const Whitener& whitener,
                       const std::vector<Piece>& pieces, double response_sd_m, double reach_m) {
    const Eigen::Index n = place_m.size();
    Basis basis(Eigen::VectorXd::Zero(n));
    const Eigen::MatrixXd columns = make_columns(pieces, place_m, response_sd_m);
    for (Eigen::Index k = 0; k < columns.cols(); ++k)
        basis.add(whitener.apply(columns.col(k).array()));
    Eigen::ArrayXd sd = Eigen::ArrayXd::Constant(n, std::numeric_limits<double>::quiet_NaN());
    const double spacing = (place_m[n - 1] - place_m[0]) / double(n - 1);
    const auto lead = static_cast<Eigen::Index>(std::ceil(3.0 * response_sd_m / spacing)) + 1;
    const auto band = static_cast<Eigen::Index>(reach_m / spacing) + lead;
    Eigen::ArrayXd shape(std::min(band, n));
    Eigen::VectorXd white(shape.size());
    for (Eigen::Index j = 1; j < n; ++j) {
        const double at = 0.5 * (place_m[j - 1] + place_m[j]);
        const Eigen::Index first = std::max<Eigen::Index>(0, j - lead);
        const Eigen::Index length = std::min(shape.size(), n - first);
        for (Eigen::Index k = 0; k < length; ++k)
            shape[k] = seen_step(place_m[first + k] - at, response_sd_m);
        whitener.apply_from(first, shape.head(length), white.head(length));
        const double full = white.head(length).squaredNorm();
        const double left = full - basis.part2(first, white.head(length));
        if (left > 0.03 * full)
            sd[j] = 1.0 / std::sqrt(left);
    }
    if (n > 1)
        sd[0] = sd[1];
    return sd;
}

} // namespace rillstrand::stream

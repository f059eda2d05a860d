// SPDX-License-Identifier: Apache-2.0
#include "stream/scan_parts.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {
constexpr std::array<double, 9> mixing_lengths_m{0.0, 2.0, 3.0, 4.2, 6.0, 8.5, 12.0, 17.0, 24.0};
}

bool Basis::add(const Eigen::VectorXd& column) {
    Eigen::VectorXd q = column;
    const double before = q.norm();
    if (m_count > 0)
        for (int twice = 0; twice < 2; ++twice) {
            const auto c = m_columns.leftCols(m_count);
            const Eigen::VectorXd p = c.transpose() * q;
            q.noalias() -= c * p;
        }
    const double after = q.norm();
    if (!(after > 1e-4 * before))
        return false;
    q /= after;
    m_residual -= q.dot(m_residual) * q;
    if (m_count == m_columns.cols())
        m_columns.conservativeResize(q.size(), std::max<Eigen::Index>(8, 2 * m_count));
    m_columns.col(m_count++) = q;
    return true;
}

double Basis::part2(Eigen::Index first, const Eigen::Ref<const Eigen::VectorXd>& segment) const {
    return parts(first, segment).squaredNorm();
}

Eigen::VectorXd Basis::parts(Eigen::Index first,
                             const Eigen::Ref<const Eigen::VectorXd>& segment) const {
    if (m_count == 0)
        return Eigen::VectorXd(0);
    return m_columns.block(first, 0, segment.size(), m_count).transpose() * segment;
}

namespace {
double mixing_price(const Piece& piece, const ScanLevels& levels) {
    if (!(piece.mixing_m > 0.0))
        return 0.0;
    return piece.far_bank ? levels.slow_gain : levels.plume_gain;
}

/// The size by which a piece's shape bends.
double bend_of(const Piece& piece, double value, double second) {
    return std::clamp(piece.far_bank ? 1.0 - std::exp(-value) : second, -0.5, 0.5);
}

/// A plume is what still mixes in: the cable sees none of it at first, or up to some three
/// times the mixed step, never the other sign.
bool odd_plume(double ratio) {
    return ratio < -1.3 || ratio > 4.0;
}
} // namespace

Eigen::Index LocalFit::first_channel(double place_m) const {
    const double from = place_m - 4.0 * m_response;
    const auto* begin = m_place.data();
    return std::min<Eigen::Index>(std::lower_bound(begin, begin + m_place.size(), from) - begin,
                                  m_place.size() - 1);
}

std::vector<Eigen::VectorXd> LocalFit::columns(const Piece& piece) const {
    const Eigen::MatrixXd plain = make_columns({piece}, m_place, m_response);
    std::vector<Eigen::VectorXd> out;
    for (Eigen::Index k = 0; k < plain.cols(); ++k)
        out.push_back(m_whitener.apply(plain.col(k).array()));
    return out;
}

double LocalFit::gain(const Piece& piece, const Basis& basis, double* value, double* value_sd,
                      double* second) const {
    const Eigen::Index first = first_channel(piece.at_m);
    const double until = std::max(piece.at_m, piece.to_m) + m_levels.reach_m;
    Eigen::Index length = 0;
    while (first + length < m_place.size() && m_place[first + length] <= until)
        ++length;
    const Eigen::MatrixXd plain = make_columns({piece}, m_place.segment(first, length), m_response);
    const Eigen::Index width = plain.cols();
    Eigen::MatrixXd white(length, width);
    Eigen::MatrixXd parts(0, width);
    for (Eigen::Index k = 0; k < width; ++k) {
        m_whitener.apply_from(first, plain.col(k).array(), white.col(k));
        const Eigen::VectorXd p = basis.parts(first, white.col(k));
        if (parts.rows() != p.size())
            parts.resize(p.size(), width);
        parts.col(k) = p;
    }
    const Eigen::VectorXd full = white.colwise().squaredNorm();
    const Eigen::MatrixXd normal = white.transpose() * white - parts.transpose() * parts;
    const Eigen::VectorXd dot = white.transpose() * basis.residual().segment(first, length);
    if (!(normal(0, 0) > 1e-3 * full[0]))
        return 0.0;
    Eigen::MatrixXd inverse(width, width);
    if (width == 1) {
        inverse(0, 0) = 1.0 / normal(0, 0);
    } else {
        const double det = normal(0, 0) * normal(1, 1) - normal(0, 1) * normal(1, 0);
        if (!(det > 1e-3 * normal(0, 0) * normal(1, 1)))
            return 0.0;
        inverse << normal(1, 1), -normal(0, 1), -normal(1, 0), normal(0, 0);
        inverse /= det;
    }
    const Eigen::VectorXd beta = inverse * dot;
    if (value != nullptr)
        *value = beta[0];
    if (value_sd != nullptr)
        *value_sd = std::sqrt(inverse(0, 0));
    if (second != nullptr)
        *second = width > 1 ? beta[1] : 0.0;
    return dot.dot(beta);
}

double LocalFit::level(const Piece& piece, double value) const {
    if (piece.type == Piece::Type::box)
        return m_levels.box_gain;
    if (piece.type == Piece::Type::kink)
        return m_levels.kink_gain;
    return (value > 0.0 ? m_levels.step_gain : m_levels.fall_gain) + mixing_price(piece, m_levels);
}

void LocalFit::slide(Piece& piece, double Piece::*edge, double step_m, const Basis& basis) const {
    double best = gain(piece, basis);
    for (double step = step_m; step > 0.02; step *= 0.5)
        for (int turn = 0; turn < 4; ++turn) {
            bool moved = false;
            for (const double by : {step, -step}) {
                Piece trial = piece;
                trial.*edge += by;
                const bool inside =
                    trial.at_m > m_place[0] && trial.at_m < m_place[m_place.size() - 1];
                if (!inside || (trial.type == Piece::Type::box && trial.to_m < trial.at_m + 0.1))
                    continue;
                const double now = gain(trial, basis);
                if (now > best + 1e-9) {
                    best = now;
                    piece = trial;
                    moved = true;
                    break;
                }
            }
            if (!moved)
                break;
        }
}

Piece LocalFit::improve(Piece piece, const Basis& basis) const {
    const double spacing = (m_place[m_place.size() - 1] - m_place[0]) / double(m_place.size() - 1);
    if (piece.type == Piece::Type::kink)
        return piece;
    if (piece.type == Piece::Type::box) {
        slide(piece, &Piece::at_m, spacing, basis);
        slide(piece, &Piece::to_m, spacing, basis);
        return piece;
    }
    Piece best = piece;
    double most = -std::numeric_limits<double>::infinity();
    for (const bool far_bank : {false, true})
        for (const double mixing : mixing_lengths_m) {
            if (mixing > 0.0 ? mixing < 2.0 * m_response : far_bank)
                continue;
            Piece trial = piece;
            trial.mixing_m = mixing;
            trial.far_bank = far_bank;
            slide(trial, &Piece::at_m, std::max(spacing, 0.4 * mixing), basis);
            double value = 0.0, value_sd = 1.0, second = 0.0;
            double all = gain(trial, basis, &value, &value_sd, &second);
            if (mixing > 0.0) {
                trial.curve = bend_of(trial, value, second);
                all = gain(trial, basis, &value, &value_sd, &second);
            }
            if (trial.width() == 2 && (value == 0.0 || odd_plume(second / value)))
                continue;
            const double net = all - mixing_price(trial, m_levels);
            if (net > most) {
                most = net;
                best = trial;
            }
        }
    if (best.mixing_m > 0.0)
        tune_plume(best, basis);
    return best;
}

/// Length, bend and place of a plume in turn.
void LocalFit::tune_plume(Piece& piece, const Basis& basis) const {
    for (int round = 0; round < 2; ++round) {
        double value = 0.0, value_sd = 0.0, second = 0.0;
        gain(piece, basis, &value, &value_sd, &second);
        piece.curve = bend_of(piece, value, second);
        double most = gain(piece, basis);
        for (double factor = 1.2; factor > 1.02; factor = std::sqrt(factor))
            for (const double f : {factor, 1.0 / factor}) {
                Piece trial = piece;
                trial.mixing_m =
                    std::clamp(piece.mixing_m * f, 2.0 * m_response, mixing_lengths_m.back() * 1.2);
                slide(trial, &Piece::at_m, 0.2, basis);
                const double now = gain(trial, basis);
                if (now > most + 1e-9) {
                    most = now;
                    piece = trial;
                }
            }
    }
}

Basis LocalFit::without(const std::vector<Piece>& pieces, std::size_t left_out,
                        const Eigen::VectorXd& white) const {
    Basis basis(white);
    for (std::size_t k = 0; k < pieces.size(); ++k)
        if (k != left_out)
            for (const Eigen::VectorXd& c : columns(pieces[k]))
                basis.add(c);
    return basis;
}

/// A step up and the same step down some way below is a box: one number instead of two.
bool LocalFit::join_opposites(std::vector<Piece>& pieces, const Eigen::VectorXd& white) const {
    std::sort(pieces.begin(), pieces.end(),
              [](const Piece& a, const Piece& b) { return a.at_m < b.at_m; });
    std::vector<std::size_t> steps;
    for (std::size_t k = 0; k < pieces.size(); ++k)
        if (pieces[k].type == Piece::Type::step && !pieces[k].declared)
            steps.push_back(k);
    for (std::size_t i = 0; i + 1 < steps.size(); ++i) {
        const std::size_t a = steps[i], b = steps[i + 1];
        if (pieces[b].at_m - pieces[a].at_m > m_levels.widest_join_m)
            continue;
        Basis basis(white);
        for (std::size_t k = 0; k < pieces.size(); ++k)
            if (k != a && k != b)
                for (const Eigen::VectorXd& c : columns(pieces[k]))
                    basis.add(c);
        Basis both = basis;
        double first = 0.0, second = 0.0;
        gain(pieces[b], without(pieces, b, white), &second);
        gain(pieces[a], without(pieces, a, white), &first);
        if (first * second >= 0.0)
            continue;
        const double before = basis.residual().squaredNorm();
        for (const std::size_t k : {a, b})
            for (const Eigen::VectorXd& c : columns(pieces[k]))
                both.add(c);
        const double gain_both = before - both.residual().squaredNorm();
        Piece box = pieces[a];
        box.type = Piece::Type::box;
        box.mixing_m = 0.0;
        box.to_m = pieces[b].at_m;
        box = improve(box, basis);
        if (gain(box, basis) > gain_both - 9.0) { // three standard deviations of the difference
            pieces[a] = box;
            pieces.erase(pieces.begin() + static_cast<std::ptrdiff_t>(b));
            return true;
        }
    }
    return false;
}

double LocalFit::cost(const std::vector<Piece>& pieces, const Eigen::VectorXd& white) const {
    const Basis basis = without(pieces, pieces.size(), white);
    double sum = basis.residual().squaredNorm();
    for (const Piece& piece : pieces)
        sum += level(piece, 1.0);
    return sum;
}

/// Two steps close together are one whose mixing was not seen at first, if one does about as well.
bool LocalFit::join_near(std::vector<Piece>& pieces, const Eigen::VectorXd& white) const {
    std::sort(pieces.begin(), pieces.end(),
              [](const Piece& a, const Piece& b) { return a.at_m < b.at_m; });
    for (std::size_t a = 0; a < pieces.size(); ++a)
        for (std::size_t b = a + 1; b < pieces.size() && pieces[b].at_m - pieces[a].at_m < 12.0;
             ++b) {
            if (pieces[a].type != Piece::Type::step || pieces[b].type != Piece::Type::step ||
                pieces[b].declared)
                continue;
            std::vector<Piece> rest = pieces;
            rest.erase(rest.begin() + static_cast<std::ptrdiff_t>(b));
            rest.erase(rest.begin() + static_cast<std::ptrdiff_t>(a));
            const Basis basis = without(rest, rest.size(), white);
            Piece one = improve(pieces[a], basis);
            const Piece other = improve(pieces[b], basis);
            if (gain(other, basis) - mixing_price(other, m_levels) >
                gain(one, basis) - mixing_price(one, m_levels))
                one = other;
            one.declared = pieces[a].declared;
            std::vector<Piece> joined = rest;
            joined.push_back(one);
            if (cost(joined, white) < cost(pieces, white) + 8.0) {
                pieces = std::move(joined);
                return true;
            }
        }
    return false;
}

/// The reverse: a box whose two edges differ by more than their error is two steps.
bool LocalFit::split_box(std::vector<Piece>& pieces, const Eigen::VectorXd& white) const {
    for (std::size_t k = 0; k < pieces.size(); ++k) {
        if (pieces[k].type != Piece::Type::box || pieces[k].to_m - pieces[k].at_m < 4.0)
            continue;
        const Basis basis = without(pieces, k, white);
        Piece upper = pieces[k], lower = pieces[k];
        upper.type = lower.type = Piece::Type::step;
        upper.to_m = lower.to_m = 0.0;
        lower.at_m = pieces[k].to_m;
        Basis both = basis;
        for (const Piece* piece : {&upper, &lower})
            for (const Eigen::VectorXd& c : columns(*piece))
                both.add(c);
        const double two = basis.residual().squaredNorm() - both.residual().squaredNorm();
        if (two > gain(pieces[k], basis) + m_levels.step_gain) {
            pieces[k] = upper;
            pieces.push_back(lower);
            return true;
        }
    }
    return false;
}

std::vector<Piece> LocalFit::settle(std::vector<Piece> pieces, const Eigen::VectorXd& white) const {
    for (int sweep = 0; sweep < 2; ++sweep) {
        for (std::size_t k = 0; k < pieces.size(); ++k)
            if (pieces[k].type != Piece::Type::kink && !pieces[k].declared)
                pieces[k] = improve(pieces[k], without(pieces, k, white));
        while (join_near(pieces, white)) {
        }
        while (split_box(pieces, white)) {
        }
        while (join_opposites(pieces, white)) {
        }
        while (!pieces.empty()) { // the least one first, while it earns too little
            std::size_t least = pieces.size();
            double shortest = 0.0;
            for (std::size_t k = 0; k < pieces.size(); ++k) {
                double value = 0.0, sd = 1.0;
                const double g = gain(pieces[k], without(pieces, k, white), &value, &sd);
                pieces[k].score = std::abs(value) / sd;
                double lacks = g - level(pieces[k], value);
                if (pieces[k].type == Piece::Type::step)
                    lacks = std::min(lacks,
                                     value * value / (sd * sd) -
                                         (value > 0.0 ? m_levels.step_gain : m_levels.fall_gain));
                if (!pieces[k].declared && lacks < shortest) {
                    shortest = lacks;
                    least = k;
                }
            }
            if (least == pieces.size())
                break;
            pieces.erase(pieces.begin() + static_cast<std::ptrdiff_t>(least));
        }
    }
    std::sort(pieces.begin(), pieces.end(),
              [](const Piece& a, const Piece& b) { return a.at_m < b.at_m; });
    return pieces;
}

StepPosterior locate_step(const Eigen::ArrayXd& place_m, const Eigen::ArrayXd& profile,
                          const Whitener& whitener, const std::vector<Piece>& pieces,
                          std::size_t which, double response_sd_m, double reach_m) {
    ScanLevels levels;
    levels.reach_m = reach_m;
    const LocalFit fit(place_m, whitener, response_sd_m, levels);
    Basis basis(whitener.apply(profile));
    for (std::size_t k = 0; k < pieces.size(); ++k)
        if (k != which)
            for (const Eigen::VectorXd& c : fit.columns(pieces[k]))
                basis.add(c);
    struct Node {
        double at, mixing, gain, value, sd, plume, cell;
    };
    std::vector<Node> nodes;
    double most = -std::numeric_limits<double>::infinity();
    const double end = place_m[place_m.size() - 1];
    const Piece& start = pieces[which];
    const auto look = [&](double at, double mixing, bool far_bank, double cell) {
        if (at <= place_m[0] || at >= end || (mixing > 0.0 && mixing < 2.0 * response_sd_m))
            return;
        Piece trial = start;
        trial.at_m = at;
        trial.mixing_m = mixing;
        trial.far_bank = far_bank;
        Node node{at, mixing, 0.0, 0.0, 1.0, 0.0, cell};
        node.gain = fit.gain(trial, basis, &node.value, &node.sd, &node.plume);
        if (mixing > 0.0 && std::abs(node.value) > 0.02) { // below that the bend is nothing
            trial.curve = bend_of(trial, node.value, node.plume);
            node.gain = fit.gain(trial, basis, &node.value, &node.sd, &node.plume);
        }
        if (!(node.gain > 0.0) || node.value == 0.0)
            return;
        node.plume = far_bank ? -1.0 : node.plume / node.value;
        if (trial.width() == 2 && odd_plume(node.plume))
            return;
        node.gain -= mixing > 0.0 ? (far_bank ? 2.0 : 6.0) : 0.0; // about ln n a number more
        most = std::max(most, node.gain);
        nodes.push_back(node);
    };
    const auto in_fine = [&](double at, double mixing, bool far_bank) {
        const bool same_kind = (mixing > 0.0) == (start.mixing_m > 0.0) &&
                               (mixing == 0.0 || far_bank == start.far_bank);
        return same_kind && std::abs(at - start.at_m) < 1.25 &&
               (mixing == 0.0 || std::abs(std::log(mixing / start.mixing_m)) < 0.26);
    };
    const double half = 10.0, coarse = 0.5, fine = 0.1; // metres, chosen here
    for (const bool far_bank : {false, true})
        for (const double mixing : mixing_lengths_m)
            for (double by = -half; by <= half; by += coarse)
                if ((mixing > 0.0 || !far_bank) && !in_fine(start.at_m + by, mixing, far_bank))
                    look(start.at_m + by, mixing, far_bank, coarse * (mixing > 0.0 ? 0.35 : 1.0));
    for (double by = -1.2; by <= 1.201; by += fine) {
        if (!(start.mixing_m > 0.0))
            look(start.at_m + by, 0.0, false, fine);
        else
            for (int k = -4; k <= 4; ++k)
                look(start.at_m + by, start.mixing_m * std::exp(0.0578 * k), start.far_bank,
                     fine * 0.0578);
    }
    const double spacing = (end - place_m[0]) / double(place_m.size() - 1);
    const auto square = [](double x) { return x * x; };
    StepPosterior out;
    double total = 0.0, square_at = 0.0, square_value = 0.0, best = -1.0;
    std::vector<std::pair<double, double>> mass;
    for (const Node& node : nodes) {
        const double w = node.cell * std::exp(0.5 * (node.gain - most));
        total += w;
        out.at_m += w * node.at;
        square_at += w * node.at * node.at;
        out.value += w * node.value;
        square_value += w * (node.value * node.value + node.sd * node.sd);
        mass.emplace_back(node.at, w);
        if (node.gain > best) {
            best = node.gain;
            out.mixing_m = node.mixing;
            out.plume = node.plume;
        }
    }
    if (!(total > 0.0)) {
        out.at_m = pieces[which].at_m;
        out.at_sd_m = half;
        out.value_sd = std::numeric_limits<double>::infinity();
        return out;
    }
    out.at_m /= total;
    out.value /= total;
    out.at_sd_m = std::sqrt(std::max(0.0, square_at / total - out.at_m * out.at_m) +
                            square(0.1 * spacing) + square(0.2 * response_sd_m));
    out.value_sd = std::sqrt(std::max(0.0, square_value / total - out.value * out.value));
    std::sort(mass.begin(), mass.end());
    double sum = 0.0;
    out.low_m = mass.front().first;
    out.high_m = mass.back().first;
    bool low_set = false;
    for (const auto& [at, w] : mass) {
        sum += w / total;
        if (!low_set && sum >= 0.025) {
            out.low_m = at;
            low_set = true;
        }
        if (sum >= 0.975) {
            out.high_m = at;
            break;
        }
    }
    return out;
}

} // namespace rillstrand::stream

// SPDX-License-Identifier: Apache-2.0
#include "stream/pieces.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace rillstrand::stream {

double seen_step(double x_m, double sd_m) {
    return 0.5 * std::erfc(-x_m / (sd_m * std::numbers::sqrt2));
}

namespace {
/// -ln(1 - g e) / g: a plume e of size g as it stands in a logarithmic profile.
double bent(double plume, double size) {
    const double z = std::clamp(size * plume, -0.9, 0.9);
    return std::abs(z) < 1e-6 ? plume : -std::log1p(-z) / size;
}

/// ln(1 - f u) / ln(1 - f): a step that comes up as u, of share f, in a logarithmic profile.
double bent_step(double shape, double share) {
    if (std::abs(share) < 1e-6)
        return shape;
    return std::log1p(-share * std::clamp(shape, 0.0, 1.0)) / std::log1p(-share);
}
} // namespace

double seen_plume(double x_m, double mixing_m, double sd_m) {
    if (x_m < -6.0 * sd_m)
        return 0.0;
    const double s2 = sd_m * sd_m;
    const double lift = std::min(0.5 * s2 / (mixing_m * mixing_m) - x_m / mixing_m, 50.0);
    return std::exp(lift) * seen_step(x_m - s2 / mixing_m, sd_m);
}

Eigen::MatrixXd make_columns(const std::vector<Piece>& pieces, const Eigen::ArrayXd& place_m,
                             double response_sd_m) {
    Eigen::Index width = 0;
    for (const Piece& piece : pieces)
        width += piece.width();
    Eigen::MatrixXd columns(place_m.size(), width);
    Eigen::Index k = 0;
    for (const Piece& piece : pieces) {
        for (Eigen::Index j = 0; j < place_m.size(); ++j) {
            const double x = place_m[j] - piece.at_m;
            switch (piece.type) {
            case Piece::Type::step:
                columns(j, k) = seen_step(x, response_sd_m);
                if (piece.mixing_m > 0.0) {
                    const double plume = seen_plume(x, piece.mixing_m, response_sd_m);
                    if (piece.far_bank)
                        columns(j, k) = bent_step(columns(j, k) - plume, piece.curve);
                    else
                        columns(j, k + 1) = bent(plume, piece.curve);
                }
                break;
            case Piece::Type::box:
                columns(j, k) =
                    seen_step(x, response_sd_m) - seen_step(place_m[j] - piece.to_m, response_sd_m);
                break;
            case Piece::Type::kink:
                columns(j, k) = std::max(0.0, x);
                break;
            }
        }
        k += piece.width();
    }
    return columns;
}

std::vector<Eigen::Index> first_columns(const std::vector<Piece>& pieces) {
    std::vector<Eigen::Index> first;
    Eigen::Index k = 0;
    for (const Piece& piece : pieces) {
        first.push_back(k);
        k += piece.width();
    }
    return first;
}

} // namespace rillstrand::stream

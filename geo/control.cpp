// SPDX-License-Identifier: Apache-2.0
#include "control.hpp"

#include "base/text.hpp"
#include "record/delimited.hpp"

#include <Eigen/QR>

#include <algorithm>
#include <cmath>

namespace rillstrand::geo {

PointsXY Similarity::apply(const PointsXY& points) const {
    const double c = scale * std::cos(rotation_rad), s = scale * std::sin(rotation_rad);
    PointsXY result(points.rows(), 2);
    result.col(0) = x0 + c * points.col(0) - s * points.col(1);
    result.col(1) = y0 + s * points.col(0) + c * points.col(1);
    return result;
}

Similarity fit_similarity(const PointsXY& from, const PointsXY& to, const Eigen::ArrayXd& sd_m) {
    const Eigen::Index n = from.rows();
    if (n < 2)
        throw DataError{"control points: " + std::to_string(n) +
                        " points cannot tell shift, turn and scale; give at least two"};
    // Centred, so that large coordinates cost no digits.
    const Eigen::RowVector2d mf = from.matrix().colwise().mean(), mt = to.matrix().colwise().mean();
    Eigen::MatrixXd a(2 * n, 4);
    Eigen::VectorXd b(2 * n);
    for (Eigen::Index i = 0; i < n; ++i) {
        const double x = from(i, 0) - mf(0), y = from(i, 1) - mf(1), w = 1.0 / sd_m(i);
        a.row(2 * i) << w, 0.0, w * x, -w * y;
        a.row(2 * i + 1) << 0.0, w, w * y, w * x;
        b(2 * i) = w * (to(i, 0) - mt(0));
        b(2 * i + 1) = w * (to(i, 1) - mt(1));
    }
    const Eigen::ColPivHouseholderQR<Eigen::MatrixXd> solver{a};
    if (solver.rank() < 4)
        throw DataError{"control points: all lie at one place and cannot tell turn and scale; give "
                        "points that lie apart"};
    const Eigen::Vector4d fit = solver.solve(b);
    Similarity s;
    s.scale = std::hypot(fit(2), fit(3));
    s.rotation_rad = std::atan2(fit(3), fit(2));
    s.x0 = mt(0) + fit(0) - fit(2) * mf(0) + fit(3) * mf(1);
    s.y0 = mt(1) + fit(1) - fit(3) * mf(0) - fit(2) * mf(1);
    return s;
}

namespace {

struct ControlTable {
    PointsXY local, world;
    Eigen::ArrayXd sd_m;
    std::vector<std::string> labels;
};

ControlTable read_control(const std::filesystem::path& file) {
    const record::Delimited table = record::read_delimited(file);
    std::array<std::size_t, 4> cells{};
    const std::array<const char*, 4> names{"local_x", "local_y", "x", "y"};
    for (std::size_t k = 0; k < 4; ++k) {
        const auto found = table.column(names[k]);
        if (!found)
            throw DataError{file.string() + ":1: there is no column " + names[k] +
                            "; it needs local_x, local_y, x, y"};
        cells[k] = *found;
    }
    const auto sd = table.column("sd_m"), label = table.column("label");
    const auto n = static_cast<Eigen::Index>(table.rows.size());
    ControlTable control{PointsXY(n, 2), PointsXY(n, 2), Eigen::ArrayXd(n), {}};
    for (std::size_t i = 0; i < table.rows.size(); ++i) {
        const auto r = static_cast<Eigen::Index>(i);
        std::array<double, 4> values{};
        for (std::size_t k = 0; k < 4; ++k) {
            const auto value = table.number(i, cells[k]);
            if (!value)
                throw DataError{table.place(i) + ": " + names[k] + " is empty; give the number"};
            values[k] = *value;
        }
        control.local.row(r) << values[0], values[1];
        control.world.row(r) << values[2], values[3];
        control.sd_m(r) = std::max(1e-3, sd ? table.number(i, *sd).value_or(0.05) : 0.05);
        std::string name = label ? table.rows[i][*label] : "";
        control.labels.push_back(name.empty() ? "control " + std::to_string(i + 1) : name);
    }
    return control;
}

struct Fit {
    Similarity similarity;
    Eigen::ArrayXd distance_m;
};

Fit fit_without(const ControlTable& c, const std::vector<Eigen::Index>& kept) {
    const auto m = static_cast<Eigen::Index>(kept.size());
    PointsXY from(m, 2), to(m, 2);
    Eigen::ArrayXd sd_m(m);
    for (Eigen::Index k = 0; k < m; ++k) {
        const Eigen::Index i = kept[static_cast<std::size_t>(k)];
        from.row(k) = c.local.row(i);
        to.row(k) = c.world.row(i);
        sd_m(k) = c.sd_m(i);
    }
    Fit fit{fit_similarity(from, to, sd_m), {}};
    fit.distance_m = (fit.similarity.apply(c.local) - c.world).matrix().rowwise().norm().array();
    return fit;
}

} // namespace

ControlFit fit_control(const std::filesystem::path& file) {
    const ControlTable control = read_control(file);
    std::vector<Eigen::Index> all;
    for (Eigen::Index i = 0; i < control.local.rows(); ++i)
        all.push_back(i);
    std::vector<Eigen::Index> kept = all;
    Fit fit = fit_without(control, kept);
    ControlFit result;
    result.labels = control.labels;
    result.used.assign(all.size(), true);
    // Leaving out the point that, once left out, lies farthest beyond what its sd allows.
    while (kept.size() >= 4) {
        double worst = 5.0;
        std::size_t which = kept.size();
        for (std::size_t k = 0; k < kept.size(); ++k) {
            std::vector<Eigen::Index> without = kept;
            without.erase(without.begin() + static_cast<std::ptrdiff_t>(k));
            const Fit trial = fit_without(control, without);
            double scatter = 0.0;
            for (const Eigen::Index i : without)
                scatter += std::pow(trial.distance_m(i) / control.sd_m(i), 2);
            const double factor = std::max(
                1.0, std::sqrt(scatter / (2.0 * static_cast<double>(without.size()) - 4.0 + 1e-9)));
            const double off = trial.distance_m(kept[k]) / (control.sd_m(kept[k]) * factor * 1.5);
            if (without.size() >= 3 && off > worst) {
                worst = off;
                which = k;
            }
        }
        if (which == kept.size())
            break;
        const Eigen::Index bad = kept[which];
        kept.erase(kept.begin() + static_cast<std::ptrdiff_t>(which));
        fit = fit_without(control, kept);
        result.used[static_cast<std::size_t>(bad)] = false;
        result.warnings.push_back(
            {"control-blunder", file.string() + ": control point '" +
                                    control.labels[static_cast<std::size_t>(bad)] + "' lies " +
                                    text::fixed(fit.distance_m(bad), 2) +
                                    " m from where the others put it; it was set aside"});
    }
    result.similarity = fit.similarity;
    for (Eigen::Index i = 0; i < control.local.rows(); ++i)
        result.residual_m.push_back(fit.distance_m(i));
    if (std::abs(fit.similarity.scale - 1.0) > 0.05)
        throw DataError{file.string() + ": the local grid would be scaled by " +
                        text::fixed(fit.similarity.scale, 4) +
                        "; check for feet or exchanged columns"};
    return result;
}

} // namespace rillstrand::geo

// SPDX-License-Identifier: Apache-2.0
#include "stream/judge.hpp"

#include "base/text.hpp"

#include <Eigen/Cholesky>

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double drift_K = 0.1;        // slow wandering that no bath is asked about, chosen here
constexpr double widest_spot_m = 15.0; // chosen here: a seep at the cable, not a stretch of bed

std::string percent(double share) {
    return text::fixed(100.0 * share, 1) + " %";
}

/// Ordinary least squares with standard errors widened for residuals that follow each other.
struct Line {
    Eigen::VectorXd value, sd;
};
Line regress(const Eigen::ArrayXd& y, const std::vector<Eigen::ArrayXd>& x) {
    const Eigen::Index n = y.size();
    Eigen::MatrixXd a(n, static_cast<Eigen::Index>(x.size()));
    for (std::size_t k = 0; k < x.size(); ++k)
        a.col(static_cast<Eigen::Index>(k)) = x[k].matrix();
    Eigen::MatrixXd normal = a.transpose() * a;
    normal.diagonal() *= 1.0 + 1e-9;
    const Eigen::MatrixXd inverse =
        normal.ldlt().solve(Eigen::MatrixXd::Identity(normal.rows(), normal.cols()));
    Line line;
    line.value = inverse * (a.transpose() * y.matrix());
    const Eigen::ArrayXd rest = y - (a * line.value).array();
    const double s2 = rest.square().sum() / std::max(1.0, double(n) - double(x.size()));
    const double lag =
        n > 3 ? std::clamp((rest.head(n - 1) * rest.tail(n - 1)).sum() / rest.square().sum(), 0.0,
                           0.97)
              : 0.0;
    line.sd = (inverse.diagonal().array().max(0.0) * s2 * (1.0 + lag) / (1.0 - lag)).sqrt();
    return line;
}

const Reading* sharpest(const Solution& solution, bool constants_out, bool nights) {
    const Reading* best = nullptr;
    for (const Reading& r : solution.readings) {
        if ((constants_out && !shuts_constants_out(r.weighting)) || (nights && !r.weighting.nights))
            continue;
        if (best == nullptr || r.usual_sd < best->usual_sd)
            best = &r;
    }
    return best;
}

/// Does a step vanish when something is shut out? The two ways, that it is not there and that it is
/// all there, are weighed by their likelihood; four to one for its being there beforehand (chosen
/// here: inflows are what the cable was laid for).
bool vanishes(double value, double sd, double other, double other_sd) {
    const double error2 = other_sd * other_sd + 0.1 * sd * sd;
    const double gone = other * other / error2;
    const double there = (value - other) * (value - other) / error2;
    return there - gone > 2.0 * std::log(4.0);
}

void judge_step(Judged& judged, const Estimate* no_constants, const Estimate* nights,
                bool shuts_constants) {
    const auto k = static_cast<Eigen::Index>(judged.piece);
    const double share = 1.0 - std::exp(-judged.value);
    if (judged.value <= 0.0) {
        judged.verdict = Verdict::unexplained;
        judged.why.push_back("The stream moves away from the inflow temperature here: no "
                             "groundwater does that.");
    }
    if (no_constants != nullptr && !shuts_constants) {
        const double other = no_constants->value[k], sd = no_constants->sd[k];
        if (vanishes(std::abs(judged.value), judged.sd, judged.value < 0.0 ? -other : other, sd)) {
            judged.verdict = Verdict::loss;
            judged.why.push_back("The step is constant in time while the contrast changes (share "
                                 "from changes alone " +
                                 percent(1.0 - std::exp(-other)) + " +- " + percent(sd) +
                                 ", from the mean " + percent(share) + "): a loss in the fibre.");
            return;
        }
        if (sd * 2.5 > std::abs(judged.value)) {
            judged.constant_untold = true;
            judged.why.push_back(
                "The contrast changes too little over the record to tell this step "
                "from a constant offset of the fibre.");
        } else {
            judged.why.push_back("It follows the changing contrast: share from changes alone " +
                                 percent(1.0 - std::exp(-other)) + " +- " + percent(sd) + ".");
        }
    }
    if (judged.verdict == Verdict::unexplained)
        return;
    if (nights != nullptr) {
        const double other = nights->value[k], sd = nights->sd[k];
        if (vanishes(judged.value, judged.sd, other, sd)) {
            judged.verdict = Verdict::sun;
            judged.why.push_back("It is not there at night (" + percent(1.0 - std::exp(-other)) +
                                 " +- " + percent(sd) + "): sun or shade.");
            return;
        }
        // where the changes alone tell an inflow, disagreement means another inflow temperature
        const bool told = no_constants != nullptr && !judged.constant_untold;
        if (!told && std::abs(other - judged.value) > 4.0 * std::hypot(sd, judged.sd) &&
            std::abs(other - judged.value) > 0.6 * judged.value) {
            judged.verdict = Verdict::unexplained;
            judged.why.push_back("Day and night disagree (" + percent(1.0 - std::exp(-other)) +
                                 " +- " + percent(sd) + " at night): no mixing of two waters.");
            return;
        }
        if (other > 2.0 * sd)
            judged.why.push_back("It is there at night too: " + percent(1.0 - std::exp(-other)) +
                                 " +- " + percent(sd) + ".");
    }
}

void judge_box(Judged& judged, const Frame& frame, const Patterns& patterns, const Piece& piece,
               const std::optional<Eigen::ArrayXd>& inflow_degC) {
    const Eigen::ArrayXd off = deviation(frame, piece.at_m, piece.to_m);
    const Eigen::ArrayXd water = beside(frame, piece.at_m, 3.0 * frame.response_sd_m, -8.0);
    const double mean_water = water.mean();
    judged.mean_step_K = off.mean();
    const Line line = regress(off, {Eigen::ArrayXd::Ones(off.size()), water - mean_water,
                                    (patterns.change - patterns.change.mean()) * 3600.0});
    const double follow = line.value[1], follow_sd = line.sd[1];
    const double shift = line.value[0], shift_sd = line.sd[0];
    const double width = piece.to_m - piece.at_m;
    const bool damped = follow < -3.0 * follow_sd;
    const bool swings = follow > 3.0 * follow_sd;
    double day = 0.0, night = 0.0;
    if (patterns.night.any() && !patterns.night.all()) {
        night = patterns.night.select(off, 0.0).sum() / double(patterns.night.count());
        day = patterns.night.select(0.0, off).sum() / double(off.size() - patterns.night.count());
    }
    if (inflow_degC) {
        const Eigen::ArrayXd contrast = *inflow_degC - water;
        const double mean_contrast = contrast.isFinite().select(contrast, 0.0).mean();
        const double usual = std::sqrt(contrast.isFinite().select(contrast, 0.0).square().mean());
        const double by_mean = shift / mean_contrast;
        const double by_mean_sd = shift_sd / std::abs(mean_contrast);
        const bool mean_tells = std::abs(mean_contrast) > 0.25 * usual && by_mean_sd < 0.2;
        const bool agrees = std::abs(by_mean + follow) <
                            3.0 * std::hypot(follow_sd, by_mean_sd) + 0.35 * std::abs(by_mean);
        if (width <= widest_spot_m && mean_tells && by_mean > 3.0 * by_mean_sd && agrees) {
            judged.verdict = Verdict::spot;
            judged.why.push_back("The cable is drawn toward the inflow temperature over " +
                                 text::fixed(width, 1) +
                                 " m and the stream is as before below: a seep at the cable.");
            return;
        }
        if (width <= widest_spot_m && !mean_tells && damped) {
            judged.verdict = Verdict::spot;
            judged.why.push_back("The cable's daily swing is damped over " + text::fixed(width, 1) +
                                 " m and the stream is as before below.");
            return;
        }
    } else if (width <= widest_spot_m && damped) {
        const double meets = mean_water - shift / follow; // where the deviation would be nothing
        const double sd =
            std::abs(shift / follow) *
            std::hypot(follow_sd / follow, shift_sd / std::max(1e-9, std::abs(shift)));
        if (std::abs(meets - mean_water) > std::max(1.0, 3.0 * sd)) {
            judged.verdict = Verdict::spot;
            judged.why.push_back("The cable is drawn toward " + text::fixed(meets, 1) +
                                 " degC over " + text::fixed(width, 1) +
                                 " m and the stream is as before below.");
            return;
        }
    }
    judged.verdict = Verdict::local;
    judged.why.push_back("The cable differs from the stream over " + text::fixed(width, 1) +
                         " m and the stream is as before below.");
    if (swings) {
        judged.verdict = Verdict::dry;
        judged.why.push_back("Its swing is larger than the stream's: out of the water.");
    } else if (day > 2.0 * std::abs(night) && day > 3.0 * shift_sd) {
        judged.verdict = Verdict::sun;
        judged.why.push_back("It is warmer by day alone: sun on the cable.");
    } else if (damped) {
        judged.verdict = Verdict::damped;
        judged.why.push_back(
            "Its swing is smaller and its mean is no nearer the inflow's: under the bed.");
    }
}

} // namespace

Eigen::ArrayXd beside(const Frame& frame, double place_m, double margin_m, double span_m) {
    const double a = span_m < 0.0 ? place_m - margin_m + span_m : place_m + margin_m;
    const double b = a + std::abs(span_m);
    Eigen::ArrayXd sum = Eigen::ArrayXd::Zero(frame.n_time());
    double n = 0.0;
    for (Eigen::Index j = 0; j < frame.n_place(); ++j)
        if (frame.place_m[j] >= a && frame.place_m[j] <= b) {
            sum += frame.water_degC.col(j);
            n += 1.0;
        }
    if (n > 0.0)
        return sum / n;
    Eigen::Index nearest = 0;
    (frame.place_m - place_m).abs().minCoeff(&nearest);
    return frame.water_degC.col(nearest);
}

Eigen::ArrayXd deviation(const Frame& frame, double from_m, double to_m) {
    const double margin = 3.0 * frame.response_sd_m;
    const Eigen::ArrayXd above = beside(frame, from_m, margin, -6.0);
    const Eigen::ArrayXd below = beside(frame, to_m, margin, 6.0);
    const double inset = std::min(margin, 0.3 * (to_m - from_m));
    const Eigen::ArrayXd here =
        beside(frame, from_m, inset, std::max(to_m - from_m - 2.0 * inset, 1e-3));
    return here - 0.5 * (above + below);
}

Estimate estimate(const Frame& frame, const Reading& reading, const std::vector<Piece>& pieces) {
    Estimate out;
    const ColumnFit fit = fit_columns(reading.whitener(frame), reading.profile.value,
                                      make_columns(pieces, frame.place_m, frame.response_sd_m));
    const std::vector<Eigen::Index> first = first_columns(pieces);
    const auto n = static_cast<Eigen::Index>(pieces.size());
    out.value.resize(n);
    out.sd.resize(n);
    out.covariance.resize(n, n);
    for (Eigen::Index a = 0; a < n; ++a) {
        const Eigen::Index ka = first[static_cast<std::size_t>(a)];
        out.value[a] = fit.value[ka];
        for (Eigen::Index b = 0; b < n; ++b)
            out.covariance(a, b) = fit.covariance(ka, first[static_cast<std::size_t>(b)]);
        out.sd[a] = std::sqrt(out.covariance(a, a));
    }
    out.excess = fit.excess;
    return out;
}

namespace {

/// A step that is undone again nearby is none of the stream's, and what lies at the edge of such
/// a piece and is much smaller belongs to it.
void judge_neighbours(std::vector<Judged>& list, const std::vector<Piece>& pieces) {
    const double near_m = 90.0, edge_m = 5.0; // chosen here
    for (Judged& up : list)
        for (Judged& down : list) {
            if (up.verdict != Verdict::inflow || down.verdict != Verdict::unexplained)
                continue;
            const double apart = std::abs(pieces[up.piece].at_m - pieces[down.piece].at_m);
            const double ratio = -down.value / up.value;
            if (apart > near_m || ratio < 0.6 || ratio > 1.6)
                continue;
            up.verdict = down.verdict = Verdict::local;
            for (Judged* j : {&up, &down})
                j->why.push_back("It is undone again " + text::fixed(apart, 0) +
                                 " m away: the stream does not stay changed.");
        }
    for (Judged& small : list) {
        if (small.verdict != Verdict::inflow)
            continue;
        const double at = pieces[small.piece].at_m;
        for (const Judged& large : list) {
            const Piece& piece = pieces[large.piece];
            const bool artefact = large.verdict != Verdict::inflow &&
                                  large.verdict != Verdict::declared &&
                                  large.verdict != Verdict::spot;
            const bool edge = std::abs(piece.at_m - at) < edge_m ||
                              (piece.type == Piece::Type::box && at > piece.at_m - edge_m &&
                               at < piece.to_m + edge_m);
            const bool beside_loss = piece.type == Piece::Type::step && small.constant_untold;
            if (artefact && edge && (beside_loss || small.value < 0.4 * std::abs(large.value))) {
                small.verdict = Verdict::local;
                small.why.push_back("It lies at the edge of a larger disturbance of the cable.");
                break;
            }
        }
    }
}

} // namespace

std::vector<Judged> judge(const Frame& frame, const Patterns& patterns, const Solution& solution,
                          const std::optional<Eigen::ArrayXd>& inflow_degC) {
    const std::vector<Piece>& pieces = solution.pieces;
    if (pieces.empty())
        return {};
    const Estimate main = estimate(frame, solution.reading, pieces);
    const Reading* no_constants = sharpest(solution, true, false);
    const Reading* nights = sharpest(solution, false, true);
    const bool shuts = shuts_constants_out(solution.reading.weighting);
    std::optional<Estimate> constant_free, night;
    if (no_constants != nullptr) {
        constant_free = estimate(frame, *no_constants, pieces);
        // wandering of the instrument passes for a swing of the water and damps every share
        const double drift = drift_K / no_constants->weighting.swing_K;
        constant_free->sd = (constant_free->sd.array().square() +
                             (main.value.array() * std::min(1.0, drift * drift)).square())
                                .sqrt();
        if (no_constants->weighting.swing_K < 3.0 * drift_K)
            constant_free->sd.array() += main.value.array().abs();
    }
    if (nights != nullptr && !solution.reading.weighting.nights)
        night = estimate(frame, *nights, pieces);
    std::vector<Judged> out;
    for (std::size_t k = 0; k < pieces.size(); ++k) {
        Judged judged;
        judged.piece = k;
        judged.value = main.value[static_cast<Eigen::Index>(k)];
        judged.sd = main.sd[static_cast<Eigen::Index>(k)];
        judged.mean_step_K = nan;
        if (pieces[k].type == Piece::Type::kink)
            continue;
        if (pieces[k].declared) {
            judged.verdict = Verdict::declared;
        } else if (pieces[k].type == Piece::Type::box) {
            judge_box(judged, frame, patterns, pieces[k], inflow_degC);
        } else {
            // ice holds the stream at one temperature: its swings tell nothing there
            const Eigen::ArrayXd water =
                beside(frame, pieces[k].at_m, 3.0 * frame.response_sd_m, -8.0);
            const bool ice = (water < 0.3).count() * 5 > water.size();
            judge_step(judged, constant_free && !ice ? &*constant_free : nullptr,
                       night ? &*night : nullptr, shuts);
            judged.constant_untold = judged.constant_untold || (ice && !shuts);
        }
        out.push_back(std::move(judged));
    }
    judge_neighbours(out, pieces);
    return out;
}

} // namespace rillstrand::stream

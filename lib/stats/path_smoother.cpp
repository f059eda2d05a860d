// SPDX-License-Identifier: Apache-2.0
#include "stats/path_smoother.hpp"

#include "stats/path_dense.hpp"

#include <Eigen/LU>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>

namespace rillstrand::stats {

namespace {

using Vector = Eigen::Vector2d;
using Matrix = Eigen::Matrix2d;

/// Wide enough to be flat beside any distance on the ground, narrow enough for the arithmetic.
constexpr double flat_variance = 1e10;

Matrix noise_of(const WalkSize& size, double step) {
    Matrix q;
    q << size.rate * step * step * step / 3.0 + size.white * step, size.rate * step * step / 2.0,
        size.rate * step * step / 2.0, size.rate * step;
    return q;
}

Matrix transition(double step) {
    Matrix f = Matrix::Identity();
    f(0, 1) = step;
    return f;
}

struct State {
    Vector mean;
    Matrix covariance;
};

State start_state(const PathData& data, const PathPrior& prior) {
    State state;
    state.mean << data.value(0), prior.rate_mean;
    state.covariance << flat_variance, 0.0, 0.0, prior.rate_sd * prior.rate_sd;
    return state;
}

void predict(State& state, double step, const WalkSize& size) {
    if (step <= 0.0)
        return;
    const Matrix f = transition(step);
    state.mean = f * state.mean;
    state.covariance = f * state.covariance * f.transpose() + noise_of(size, step);
}

/// @return log density of the observation given the past
double update(State& state, double value, double variance) {
    if (!std::isfinite(variance))
        return 0.0;
    const double s = state.covariance(0, 0) + variance;
    const double surprise = value - state.mean(0);
    const Vector gain = state.covariance.col(0) / s;
    // Joseph form: stays positive where the prior is flat and the observation sharp.
    Matrix keep = Matrix::Identity();
    keep.col(0) -= gain;
    state.mean += gain * surprise;
    state.covariance =
        keep * state.covariance * keep.transpose() + gain * gain.transpose() * variance;
    return -0.5 * (std::log(2.0 * std::numbers::pi * s) + surprise * surprise / s);
}

double log_prior(const PathPrior& prior, double log_rate_step, double log_white_step) {
    const double a = (log_rate_step - prior.log_rate_step) / prior.log_rate_step_sd;
    const double b = (log_white_step - prior.log_white_step) / prior.log_white_step_sd;
    return -0.5 * (a * a + b * b);
}

WalkSize size_of(const PathPrior& prior, double log_rate_step, double log_white_step) {
    return {std::exp(2.0 * log_rate_step) / prior.scale,
            std::exp(2.0 * log_white_step) / prior.scale};
}

/// The likelihood needs no more than this many observations to tell the sizes.
PathData head_of(const PathData& data) {
    constexpr Eigen::Index enough = 4000;
    if (data.at.size() <= enough)
        return data;
    return {data.at.head(enough), data.value.head(enough), data.variance.head(enough)};
}

} // namespace

double path_log_likelihood(const PathData& data, const PathPrior& prior, const WalkSize& size) {
    State state = start_state(data, prior);
    double sum = 0.0;
    bool first = true;
    for (Eigen::Index i = 0; i < data.at.size(); ++i) {
        if (i > 0)
            predict(state, data.at(i) - data.at(i - 1), size);
        const double density = update(state, data.value(i), data.variance(i));
        if (!first)
            sum += density;
        if (std::isfinite(data.variance(i)))
            first = false;
    }
    return sum;
}

PathEstimate smooth_path(const PathData& data, const PathPrior& prior, const WalkSize& size,
                         const Eigen::ArrayXd& query) {
    const Eigen::Index n = data.at.size(), m = query.size();
    // Observations and queries in one sequence.
    struct Step {
        double at;
        Eigen::Index observation;
        Eigen::Index query;
    };
    std::vector<Step> steps;
    steps.reserve(static_cast<std::size_t>(n + m));
    for (Eigen::Index i = 0, k = 0; i < n || k < m;) {
        if (k >= m || (i < n && data.at(i) <= query(k))) {
            steps.push_back({data.at(i), i, -1});
            ++i;
        } else {
            steps.push_back({query(k), -1, k});
            ++k;
        }
    }
    std::vector<State> filtered(steps.size());
    State state = start_state(data, prior);
    for (std::size_t t = 0; t < steps.size(); ++t) {
        if (t > 0)
            predict(state, steps[t].at - steps[t - 1].at, size);
        if (steps[t].observation >= 0)
            update(state, data.value(steps[t].observation), data.variance(steps[t].observation));
        filtered[t] = state;
    }
    PathEstimate out{Eigen::ArrayXd(m), Eigen::ArrayXd(m), Eigen::ArrayXd(m)};
    State smoothed = filtered.back();
    for (std::size_t t = steps.size(); t-- > 0;) {
        if (t + 1 < steps.size()) {
            const double step = steps[t + 1].at - steps[t].at;
            if (step > 0.0) {
                State ahead = filtered[t];
                predict(ahead, step, size);
                const Matrix gain = filtered[t].covariance * transition(step).transpose() *
                                    ahead.covariance.inverse();
                const State next = smoothed;
                smoothed.mean = filtered[t].mean + gain * (next.mean - ahead.mean);
                smoothed.covariance =
                    filtered[t].covariance +
                    gain * (next.covariance - ahead.covariance) * gain.transpose();
            }
        }
        if (steps[t].query < 0)
            continue;
        out.mean(steps[t].query) = smoothed.mean(0);
        out.variance(steps[t].query) = std::max(0.0, smoothed.covariance(0, 0));
        out.rate(steps[t].query) = smoothed.mean(1);
    }
    return out;
}

/// smooth_path averaged over walk sizes, at every query by itself.
static PathEstimate averaged(const PathData& data, const PathPrior& prior,
                             const std::vector<WeightedSize>& sizes, const Eigen::ArrayXd& query) {
    PathEstimate out{Eigen::ArrayXd::Zero(query.size()), Eigen::ArrayXd::Zero(query.size()),
                     Eigen::ArrayXd::Zero(query.size())};
    std::vector<PathEstimate> parts;
    for (const auto& node : sizes) {
        parts.push_back(smooth_path(data, prior, node.size, query));
        out.mean += node.weight * parts.back().mean;
        out.rate += node.weight * parts.back().rate;
    }
    for (std::size_t k = 0; k < sizes.size(); ++k)
        out.variance += sizes[k].weight * (parts[k].variance + (parts[k].mean - out.mean).square());
    return out;
}

std::vector<WeightedSize> walk_sizes(const std::vector<PathData>& series, const PathPrior& prior) {
    std::vector<PathData> heads;
    for (const auto& data : series)
        heads.push_back(head_of(data));
    constexpr int half = 5; // grid of 11 x 11 over +-2.5 sd of the belief
    std::vector<WeightedSize> grid;
    double best = -std::numeric_limits<double>::infinity();
    for (int i = -half; i <= half; ++i) {
        for (int k = -half; k <= half; ++k) {
            const double rate = prior.log_rate_step + 0.5 * i * prior.log_rate_step_sd;
            const double white = prior.log_white_step + 0.5 * k * prior.log_white_step_sd;
            const WalkSize size = size_of(prior, rate, white);
            double log_belief = log_prior(prior, rate, white);
            for (const auto& data : heads)
                log_belief += path_log_likelihood(data, prior, size);
            grid.push_back({size, log_belief});
            best = std::max(best, log_belief);
        }
    }
    double sum = 0.0;
    for (auto& node : grid) {
        node.weight = std::exp(node.weight - best);
        sum += node.weight;
    }
    std::vector<WeightedSize> kept;
    double kept_sum = 0.0;
    for (const auto& node : grid)
        if (node.weight / sum >= 0.01) {
            kept.push_back(node);
            kept_sum += node.weight;
        }
    for (auto& node : kept)
        node.weight /= kept_sum;
    return kept;
}

PathEstimate smooth_path(const PathData& data, const PathPrior& prior,
                         const std::vector<WeightedSize>& sizes, const Eigen::ArrayXd& query) {
    if (query.size() == 0)
        return {};
    const DensePath dense{data.at, query};
    const PathEstimate few = averaged(data, prior, sizes, dense.nodes());
    return {dense.at_queries(few.mean), dense.at_queries(few.variance).max(0.0),
            dense.at_queries(few.rate)};
}
LeftOut leave_one_out(const PathData& data, const PathPrior& prior,
                      const std::vector<WeightedSize>& sizes) {
    LeftOut out{Eigen::ArrayXd::Zero(data.at.size()), Eigen::ArrayXd::Zero(data.at.size())};
    std::vector<Eigen::ArrayXd> means, variances;
    for (const auto& node : sizes) {
        const PathEstimate at = smooth_path(data, prior, node.size, data.at);
        // With the observation: 1/v = 1/v_out + 1/s2; solved for what is known without it.
        const Eigen::ArrayXd information =
            (1.0 / at.variance.max(1e-12) - 1.0 / data.variance).max(1e-10);
        means.push_back((at.mean / at.variance.max(1e-12) - data.value / data.variance) /
                        information);
        variances.push_back(1.0 / information + data.variance);
        out.predicted += node.weight * means.back();
    }
    for (std::size_t k = 0; k < sizes.size(); ++k)
        out.variance += sizes[k].weight * (variances[k] + (means[k] - out.predicted).square());
    return out;
}

} // namespace rillstrand::stats

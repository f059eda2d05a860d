// SPDX-License-Identifier: Apache-2.0
#include "stats/hidden_markov.hpp"

#include "base/error.hpp"

#include <cmath>

namespace rillstrand::stats {

namespace {

[[noreturn]] void refuse_impossible() {
    throw DataError("the observations are impossible under the hidden Markov chain; widen its "
                    "emissions or transitions");
}

} // namespace

Smoothed smooth(const HiddenMarkov& chain) {
    const Eigen::Index n = chain.log_emission.rows(), k = chain.log_emission.cols();
    Smoothed result;
    result.filtered.resize(n, k);
    result.probability.resize(n, k);
    if (n == 0)
        return result;
    Eigen::ArrayXXd seen(n, k), ahead(n, k);
    Eigen::ArrayXd scale(n);
    for (Eigen::Index t = 0; t < n; ++t) {
        const double greatest = chain.log_emission.row(t).maxCoeff();
        if (!std::isfinite(greatest))
            refuse_impossible();
        seen.row(t) = (chain.log_emission.row(t) - greatest).exp();
        if (t == 0)
            ahead.row(t) = chain.start.transpose();
        else
            ahead.row(t) = (result.filtered.row(t - 1).matrix() * chain.transition(t - 1)).array();
        const double sum = (ahead.row(t) * seen.row(t)).sum();
        if (!(sum > 0.0))
            refuse_impossible();
        scale(t) = sum;
        result.filtered.row(t) = ahead.row(t) * seen.row(t) / sum;
        result.log_likelihood += std::log(sum) + greatest;
    }
    result.pair.resize(static_cast<std::size_t>(n - 1));
    Eigen::ArrayXd behind = Eigen::ArrayXd::Ones(k);
    result.probability.row(n - 1) = result.filtered.row(n - 1);
    for (Eigen::Index t = n - 1; t-- > 0;) {
        const Eigen::MatrixXd& step = chain.transition(t);
        const Eigen::ArrayXd next = seen.row(t + 1).transpose() * behind / scale(t + 1);
        Eigen::MatrixXd& pair = result.pair[static_cast<std::size_t>(t)];
        pair = (step.array().colwise() * result.filtered.row(t).transpose().array()).matrix();
        pair = (pair.array().rowwise() * next.transpose()).matrix();
        behind = (step * next.matrix()).array();
        result.probability.row(t) = result.filtered.row(t) * behind.transpose();
        result.probability.row(t) /= result.probability.row(t).sum();
    }
    return result;
}

std::vector<Eigen::Index> most_probable_path(const HiddenMarkov& chain) {
    const Eigen::Index n = chain.log_emission.rows(), k = chain.log_emission.cols();
    std::vector<Eigen::Index> path(static_cast<std::size_t>(n));
    if (n == 0)
        return path;
    Eigen::Array<Eigen::Index, Eigen::Dynamic, Eigen::Dynamic> from(n, k);
    Eigen::ArrayXd best = chain.start.log() + chain.log_emission.row(0).transpose();
    for (Eigen::Index t = 1; t < n; ++t) {
        const Eigen::ArrayXXd step = chain.transition(t - 1).array().log();
        Eigen::ArrayXd next(k);
        for (Eigen::Index state = 0; state < k; ++state)
            next(state) =
                (best + step.col(state)).maxCoeff(&from(t, state)) + chain.log_emission(t, state);
        best = next;
    }
    Eigen::Index state = 0;
    if (!std::isfinite(best.maxCoeff(&state)))
        refuse_impossible();
    for (Eigen::Index t = n; t-- > 0;) {
        path[static_cast<std::size_t>(t)] = state;
        if (t > 0)
            state = from(t, state);
    }
    return path;
}

} // namespace rillstrand::stats

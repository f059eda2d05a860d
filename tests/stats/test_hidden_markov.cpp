// SPDX-License-Identifier: Apache-2.0
#include "stats/hidden_markov.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <limits>
#include <random>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

namespace {

struct Case {
    std::vector<Eigen::MatrixXd> steps;
    stats::HiddenMarkov chain;
};

Case random_chain(Eigen::Index n, Eigen::Index k, unsigned seed) {
    std::mt19937_64 random{seed};
    std::uniform_real_distribution<> uniform{0.05, 1.0};
    Case c;
    for (Eigen::Index t = 0; t + 1 < n; ++t) {
        Eigen::MatrixXd step(k, k);
        for (Eigen::Index i = 0; i < k; ++i) {
            for (Eigen::Index j = 0; j < k; ++j)
                step(i, j) = uniform(random);
            step.row(i) /= step.row(i).sum();
        }
        c.steps.push_back(step);
    }
    c.chain.start = Eigen::ArrayXd::NullaryExpr(k, [&] { return uniform(random); });
    c.chain.start /= c.chain.start.sum();
    c.chain.log_emission =
        Eigen::ArrayXXd::NullaryExpr(n, k, [&] { return 5.0 * std::log(uniform(random)); });
    return c;
}

void bind(Case& c) {
    c.chain.transition = [&c](Eigen::Index t) -> const Eigen::MatrixXd& {
        return c.steps[static_cast<std::size_t>(t)];
    };
}

/// Calls f(path, log probability of path and emissions) for every path there is.
template <class F> void every_path(const Case& c, F f) {
    const Eigen::Index n = c.chain.log_emission.rows(), k = c.chain.log_emission.cols();
    std::vector<Eigen::Index> path(static_cast<std::size_t>(n), 0);
    while (true) {
        double log_p = std::log(c.chain.start(path[0])) + c.chain.log_emission(0, path[0]);
        for (std::size_t t = 1; t < path.size(); ++t)
            log_p += std::log(c.steps[t - 1](path[t - 1], path[t])) +
                     c.chain.log_emission(static_cast<Eigen::Index>(t), path[t]);
        f(path, log_p);
        std::size_t at = 0;
        while (at < path.size() && ++path[at] == k)
            path[at++] = 0;
        if (at == path.size())
            return;
    }
}

} // namespace

TEST_CASE("smoothing equals the sum over all paths", "[stats][property]") {
    const auto [n, k, seed] = GENERATE(table<Eigen::Index, Eigen::Index, unsigned>(
        {{1, 2, 1U}, {2, 3, 2U}, {6, 3, 3U}, {9, 2, 4U}, {5, 4, 5U}}));
    Case c = random_chain(n, k, seed);
    bind(c);
    const stats::Smoothed found = stats::smooth(c.chain);
    Eigen::ArrayXXd marginal = Eigen::ArrayXXd::Zero(n, k);
    std::vector<Eigen::MatrixXd> pair(static_cast<std::size_t>(n - 1), Eigen::MatrixXd::Zero(k, k));
    double total = 0.0;
    every_path(c, [&](const std::vector<Eigen::Index>& path, double log_p) {
        total += std::exp(log_p);
        for (std::size_t t = 0; t < path.size(); ++t) {
            marginal(static_cast<Eigen::Index>(t), path[t]) += std::exp(log_p);
            if (t > 0)
                pair[t - 1](path[t - 1], path[t]) += std::exp(log_p);
        }
    });
    const double rounding = 1e-12;
    CHECK(((marginal / total) - found.probability).abs().maxCoeff() < rounding);
    for (std::size_t t = 0; t < pair.size(); ++t)
        CHECK((pair[t] / total - found.pair[t]).cwiseAbs().maxCoeff() < rounding);
    CHECK_THAT(found.log_likelihood, WithinAbs(std::log(total), rounding * 100.0));
}

TEST_CASE("filtering uses the past alone", "[stats][property]") {
    Case c = random_chain(7, 3, 11);
    bind(c);
    const stats::Smoothed whole = stats::smooth(c.chain);
    Case cut = c;
    cut.chain.log_emission.conservativeResize(4, Eigen::NoChange);
    bind(cut);
    const stats::Smoothed part = stats::smooth(cut.chain);
    CHECK((whole.filtered.row(3) - part.probability.row(3)).abs().maxCoeff() < 1e-12);
}

TEST_CASE("the most probable path is the best of all", "[stats][property]") {
    for (unsigned seed = 20; seed < 30; ++seed) {
        Case c = random_chain(7, 3, seed);
        bind(c);
        std::vector<Eigen::Index> best;
        double best_log_p = -std::numeric_limits<double>::infinity();
        every_path(c, [&](const std::vector<Eigen::Index>& path, double log_p) {
            if (log_p > best_log_p) {
                best_log_p = log_p;
                best = path;
            }
        });
        CHECK(stats::most_probable_path(c.chain) == best);
    }
}

TEST_CASE("thousands of steps neither underflow nor drift", "[stats][property]") {
    Case c = random_chain(5000, 2, 7);
    bind(c);
    c.chain.log_emission -= 800.0; // exp(-800) is no double
    const stats::Smoothed found = stats::smooth(c.chain);
    CHECK(found.probability.isFinite().all());
    CHECK((found.probability.rowwise().sum() - 1.0).abs().maxCoeff() < 1e-12);
}

TEST_CASE("impossible observations are refused", "[stats]") {
    Case c = random_chain(3, 2, 8);
    bind(c);
    c.chain.log_emission.row(1).setConstant(-std::numeric_limits<double>::infinity());
    CHECK_THROWS_AS(stats::smooth(c.chain), DataError);
    CHECK_THROWS_AS(stats::most_probable_path(c.chain), DataError);
}

TEST_CASE("a chain without a step is empty", "[stats]") {
    Case c = random_chain(1, 2, 9);
    bind(c);
    c.chain.log_emission.resize(0, 2);
    CHECK(stats::smooth(c.chain).probability.rows() == 0);
    CHECK(stats::most_probable_path(c.chain).empty());
}

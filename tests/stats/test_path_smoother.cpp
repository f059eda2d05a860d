// SPDX-License-Identifier: Apache-2.0
#include "stats/path_smoother.hpp"

#include <Eigen/Dense>
#include <catch2/catch.hpp>

#include <random>

using namespace rillstrand;

namespace {

const stats::PathPrior prior{0.95, 0.05, std::log(0.02), 1.0, std::log(0.3), 1.0, 100.0};

stats::PathData some_data() {
    stats::PathData data{Eigen::ArrayXd(5), Eigen::ArrayXd(5), Eigen::ArrayXd(5)};
    data.at << 0.0, 60.0, 130.0, 190.0, 260.0;
    data.value << 1.0, 58.0, 124.0, 185.0, 249.0;
    data.variance << 1.0, 2.0, 0.5, 1.0, 1.5;
    return data;
}

/// The same model as one joint Gaussian: covariance of value at u and v about a flat start.
double covariance(double u, double v, const stats::WalkSize& size) {
    const double m = std::min(u, v), far = std::max(u, v);
    const double integrated = size.rate * (m * m * far / 2.0 - m * m * m / 6.0);
    return integrated + size.white * m + prior.rate_sd * prior.rate_sd * u * v;
}

} // namespace

TEST_CASE("the smoother agrees with the joint Gaussian solved at once", "[stats][property]") {
    const stats::PathData data = some_data();
    const stats::WalkSize size{4e-6, 1e-3};
    Eigen::ArrayXd query(3);
    query << 30.0, 130.0, 220.0;
    const auto found = stats::smooth_path(data, prior, size, query);
    // Unknown: the value at 0 (flat) and everything else given the prior mean of the rate.
    const Eigen::Index n = 5;
    Eigen::MatrixXd k(n, n);
    for (Eigen::Index i = 0; i < n; ++i)
        for (Eigen::Index j = 0; j < n; ++j)
            k(i, j) = covariance(data.at(i), data.at(j), size) + (i == j ? data.variance(i) : 0.0);
    const Eigen::MatrixXd inverse = k.inverse();
    const Eigen::VectorXd one = Eigen::VectorXd::Ones(n);
    const Eigen::VectorXd rest = (data.value - prior.rate_mean * data.at).matrix();
    const double start = one.dot(inverse * rest) / one.dot(inverse * one);
    for (Eigen::Index q = 0; q < 3; ++q) {
        Eigen::VectorXd c(n);
        for (Eigen::Index i = 0; i < n; ++i)
            c(i) = covariance(query(q), data.at(i), size);
        const double mean =
            start + prior.rate_mean * query(q) + c.dot(inverse * (rest - start * one));
        const double left = 1.0 - c.dot(inverse * one);
        const double variance = covariance(query(q), query(q), size) - c.dot(inverse * c) +
                                left * left / one.dot(inverse * one);
        CHECK(found.mean(q) == Approx(mean).margin(1e-4));
        CHECK(found.variance(q) == Approx(variance).epsilon(1e-3));
    }
}

TEST_CASE("leaving one out is what fitting the others gives", "[stats][property]") {
    const stats::PathData data = some_data();
    const std::vector<stats::WeightedSize> sizes{{{4e-6, 1e-3}, 1.0}};
    const auto left = stats::leave_one_out(data, prior, sizes);
    for (Eigen::Index i = 1; i < 4; ++i) {
        stats::PathData others = data;
        others.variance(i) = std::numeric_limits<double>::infinity();
        Eigen::ArrayXd query(1);
        query << data.at(i);
        const auto there = stats::smooth_path(others, prior, sizes, query);
        CHECK(left.predicted(i) == Approx(there.mean(0)).margin(1e-3));
        CHECK(left.variance(i) == Approx(there.variance(0) + data.variance(i)).epsilon(1e-3));
    }
}

TEST_CASE("many places between observations are what each gives by itself", "[stats][property]") {
    const stats::PathData data = some_data();
    const auto sizes = stats::walk_sizes({data}, prior);
    const Eigen::ArrayXd query = Eigen::ArrayXd::LinSpaced(3001, -20.0, 290.0);
    const auto together = stats::smooth_path(data, prior, sizes, query);
    for (const Eigen::Index q : {0, 1, 193, 194, 500, 774, 1451, 2000, 2719, 3000}) {
        Eigen::ArrayXd first_and_this(2); // the belief in the rate holds at the first place
        first_and_this << query(0), query(q);
        const auto alone = stats::smooth_path(data, prior, sizes, first_and_this);
        CHECK(together.mean(q) == Approx(alone.mean(1)).margin(1e-6));
        CHECK(together.variance(q) == Approx(alone.variance(1)).margin(1e-6));
        CHECK(together.rate(q) == Approx(alone.rate(1)).margin(1e-7));
    }
}

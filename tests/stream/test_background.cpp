// SPDX-License-Identifier: Apache-2.0
#include "stream/background.hpp"
#include "stream/pieces.hpp"
#include "stream/scan.hpp"

#include <catch2/catch.hpp>

#include <Eigen/Cholesky>
#include <Eigen/LU>

#include <cmath>
#include <random>

using namespace rillstrand::stream;

TEST_CASE("whitened least squares equals generalised least squares", "[stream][property]") {
    const Eigen::Index n = 60;
    std::mt19937_64 random(4);
    std::normal_distribution<double> normal;
    const Eigen::ArrayXd place = Eigen::ArrayXd::LinSpaced(n, 0.0, 30.0) +
                                 0.1 * Eigen::ArrayXd::NullaryExpr(n, [&](Eigen::Index) {
                                     return std::abs(normal(random));
                                 });
    const double r2 = 1e-4, s2 = 0.01;
    Eigen::ArrayXd y(n);
    for (Eigen::Index i = 0; i < n; ++i)
        y[i] = 0.02 * place[i] + (place[i] > 15.0 ? 0.3 : 0.0) + 0.1 * normal(random);
    // covariance of an integrated random walk from the first place, level and slope free
    Eigen::MatrixXd v(n, n);
    for (Eigen::Index i = 0; i < n; ++i)
        for (Eigen::Index j = 0; j < n; ++j) {
            const double a = place[std::min(i, j)] - place[0];
            const double b = place[std::max(i, j)] - place[0];
            v(i, j) = r2 * a * a * (b / 2.0 - a / 6.0) + (i == j ? s2 : 0.0);
        }
    Eigen::MatrixXd x(n, 3);
    for (Eigen::Index i = 0; i < n; ++i)
        x.row(i) << (place[i] > 15.0 ? 1.0 : 0.0), 1.0, place[i] - place[0];
    const Eigen::LLT<Eigen::MatrixXd> llt(v);
    const Eigen::MatrixXd normal_matrix = x.transpose() * llt.solve(x);
    const Eigen::VectorXd beta = normal_matrix.ldlt().solve(x.transpose() * llt.solve(y.matrix()));
    const double beta_sd = std::sqrt(normal_matrix.inverse()(0, 0));

    const Whitener whitener(place, Eigen::ArrayXd::Constant(n, s2), r2);
    const ColumnFit fit = fit_columns(whitener, y, x.leftCols(1));
    const double start_is_nearly_free =
        1e-3; // the filter starts with large, not infinite, variance
    CHECK(fit.value[0] == Approx(beta[0]).epsilon(start_is_nearly_free));
    CHECK(std::sqrt(fit.covariance(0, 0) / fit.excess) ==
          Approx(beta_sd).epsilon(start_is_nearly_free));
}

TEST_CASE("shapes through the spatial response", "[stream]") {
    const double sd = 0.39;
    CHECK(seen_step(0.0, sd) == Approx(0.5));
    // 10 to 90 % of a Gaussian: 2.563103 standard deviations
    CHECK(seen_step(0.5 * 2.563103 * sd, sd) == Approx(0.9).margin(1e-6));
    CHECK(seen_plume(8.0, 4.0, sd) == Approx(std::exp(-2.0 + 0.5 * sd * sd / 16.0)).epsilon(1e-9));
    CHECK(seen_plume(-5.0, 4.0, sd) == 0.0);
    // peak of a warm patch 0.5 and 1 m wide seen through 1 m full width at half maximum
    const double fwhm = 1.0 / 2.354820;
    for (const auto& [width, peak] :
         {std::pair{0.25, 0.2315}, {0.5, 0.4439}, {1.0, 0.7610}, {2.0, 0.9815}})
        CHECK(seen_step(width / 2.0, fwhm) - seen_step(-width / 2.0, fwhm) ==
              Approx(peak).margin(6e-5));
}

TEST_CASE("the threshold for a reach bounds the chance of any false step", "[stream]") {
    const double count = 300.0, family = 0.05;
    const double z = maximum_z(count, family);
    const double tail = 0.5 * std::erfc(z / std::sqrt(2.0));
    CHECK(1.0 - std::exp(-count * tail) == Approx(family).epsilon(1e-6));
}

TEST_CASE("a profile of noise and slopes alone gives no step", "[stream]") {
    std::mt19937_64 random(11);
    std::normal_distribution<double> normal;
    const Eigen::Index n = 400;
    const Eigen::ArrayXd place = Eigen::ArrayXd::LinSpaced(n, 0.0, 199.5);
    const double sd = 0.01, r2 = sd * sd * 0.5 / std::pow(20.0, 4);
    int with_any = 0;
    const int rounds = 60;
    for (int k = 0; k < rounds; ++k) {
        Eigen::ArrayXd y(n);
        double level = 0.0, slope = 1e-3 * normal(random);
        for (Eigen::Index i = 0; i < n; ++i) {
            level += 0.5 * slope;
            slope += std::sqrt(r2 * 0.5) * normal(random);
            y[i] = level + sd * normal(random);
        }
        const auto pieces = find_pieces(place, y, Eigen::ArrayXd::Constant(n, sd * sd), r2, 0.39,
                                        make_levels(place, 0.39, 0.05), {});
        bool any = false;
        for (const Piece& piece : pieces)
            any = any || piece.type == Piece::Type::step;
        with_any += any ? 1 : 0;
    }
    CHECK(with_any <= 6); // 3 expected at 5 %; more than 6 has a chance of 3 %
}

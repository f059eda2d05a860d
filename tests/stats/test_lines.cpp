// SPDX-License-Identifier: Apache-2.0
#include "stats/lines.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

namespace {

Eigen::ArrayXd array(std::initializer_list<double> values) {
    Eigen::ArrayXd result(static_cast<Eigen::Index>(values.size()));
    std::copy(values.begin(), values.end(), result.data());
    return result;
}

// Points of Pearson (1901), Phil. Mag. 2, 559-572, with the weights of York (1966), Can. J. Phys.
// 44, 1079-1086.
const Eigen::ArrayXd x = array({0.0, 0.9, 1.8, 2.6, 3.3, 4.4, 5.2, 6.1, 6.5, 7.4});
const Eigen::ArrayXd y = array({5.9, 5.4, 4.4, 4.6, 3.5, 3.7, 2.8, 2.8, 2.4, 1.5});
const Eigen::ArrayXd wx = array({1000, 1000, 500, 800, 200, 80, 60, 20, 1.8, 1});
const Eigen::ArrayXd wy = array({1, 1.8, 4, 8, 20, 20, 70, 70, 100, 500});

} // namespace

// York et al. (2004), Am. J. Phys. 72, 367-375, Table II; Cantrell (2008), Atmos. Chem. Phys. 8,
// 5477-5487, Table 2. S-01 to S-08.
TEST_CASE("York's line through Pearson's points matches the published values",
          "[stats][published]") {
    const auto fit = stats::york(x, wx, y, wy);
    const double printed = 1e-10;
    CHECK_THAT(fit.line.intercept, WithinAbs(5.47991022403, printed));
    CHECK_THAT(fit.line.slope, WithinAbs(-0.48053340745, printed));
    CHECK_THAT(fit.line.intercept_sd, WithinAbs(0.294970735, 1e-9));
    CHECK_THAT(fit.line.slope_sd, WithinAbs(0.0579850090, 1e-10));
    CHECK_THAT(fit.chi_square, WithinAbs(11.866353194, 1e-9));
    const double scale = std::sqrt(fit.chi_square / 8.0);
    CHECK_THAT(fit.chi_square / 8.0, WithinAbs(1.483294149, 1e-9));
    CHECK_THAT(fit.line.intercept_sd * scale, WithinAbs(0.359246523, 1e-9));
    CHECK_THAT(fit.line.slope_sd * scale, WithinAbs(0.070620270, 1e-9));
    CHECK_THAT(fit.covariance, WithinAbs(-0.016472545, 1e-9));
    CHECK_THAT(fit.covariance / (fit.line.intercept_sd * fit.line.slope_sd),
               WithinAbs(-0.96308814, 1e-8));
    CHECK_THAT(fit.probability, WithinAbs(0.157267, 1e-6));
    // scipy 1.10 ODR on the same data.
    CHECK_THAT(fit.line.intercept, WithinAbs(5.479912, 5e-6));
    CHECK_THAT(fit.line.slope, WithinAbs(-0.480534, 2e-6));
}

// S-20 to S-26: the same ten points, unweighted; S-20 and S-22 also printed by Pearson (1901).
TEST_CASE("other lines through Pearson's points", "[stats][published]") {
    const double printed = 5e-9;
    const auto ols = stats::least_squares(x, y);
    CHECK_THAT(ols.intercept, WithinAbs(5.76118519, printed));
    CHECK_THAT(ols.slope, WithinAbs(-0.53957727, printed));
    CHECK_THAT(ols.intercept_sd, WithinAbs(0.189485, 1e-6));
    CHECK_THAT(ols.slope_sd, WithinAbs(0.0421265, 1e-7));
    const auto inverse = stats::inverse_least_squares(x, y);
    CHECK_THAT(inverse.intercept, WithinAbs(5.86169570, printed));
    CHECK_THAT(inverse.slope, WithinAbs(-0.56588893, printed));
    const auto orthogonal = stats::deming(x, y, 1.0);
    CHECK_THAT(orthogonal.intercept, WithinAbs(5.78404377, printed));
    CHECK_THAT(orthogonal.slope, WithinAbs(-0.54556120, printed));
    CHECK_THAT(orthogonal.slope, WithinAbs(-0.546, 5e-4)); // as Pearson printed it
    CHECK_THAT(stats::deming(x, y, 2.0).slope, WithinAbs(-0.54293896, printed));
    CHECK_THAT(stats::deming(x, y, 4.0).slope, WithinAbs(-0.54136798, printed));
    CHECK_THAT(stats::deming(x, y, 0.5).intercept, WithinAbs(5.79859487, printed));
    const auto major = stats::reduced_major_axis(x, y);
    CHECK_THAT(major.intercept, WithinAbs(5.81084229, printed));
    CHECK_THAT(major.slope, WithinAbs(-0.55257651, printed));
    const auto weighted = stats::weighted_least_squares(x, y, wy);
    CHECK_THAT(weighted.intercept, WithinAbs(6.10010932, printed));
    CHECK_THAT(weighted.slope, WithinAbs(-0.61081296, printed));
    const auto robust = stats::theil_sen(x, y);
    CHECK_THAT(robust.slope, WithinAbs(-0.53571429, printed));
    CHECK_THAT(robust.intercept, WithinAbs(5.6625, 1e-9));
    CHECK_THAT(robust.slope_low, WithinAbs(-0.645833, 1e-6));
    CHECK_THAT(robust.slope_high, WithinAbs(-0.470588, 1e-6));
}

// Five-logger correction of the Maisbich record: W. Luxemburg and M. Westhoff (2011), calibrated
// temperatures, TU Delft research record. M-40, M-41; printed -1.16, 8.03e-4 and 0.085, 1.78e-5.
TEST_CASE("the correction lines of an open stream record are found again", "[stats][published]") {
    const Eigen::ArrayXd at_m = array({26, 395, 931, 1111, 1270});
    const auto offset = stats::least_squares(at_m, array({-1.31, -0.49, -0.69, -0.25, -0.056}));
    CHECK_THAT(offset.intercept, WithinAbs(-1.15767, 5e-6));
    CHECK_THAT(offset.slope, WithinAbs(8.0159e-4, 5e-9));
    const auto slope = stats::least_squares(at_m, array({0.0974, 0.0664, 0.122, 0.109, 0.0965}));
    CHECK_THAT(slope.intercept, WithinAbs(0.085037, 5e-7));
    CHECK_THAT(slope.slope, WithinAbs(1.77108e-5, 5e-10));
}

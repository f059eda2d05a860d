// SPDX-License-Identifier: Apache-2.0
#include "control.hpp"
#include "fibre_map.hpp"
#include "route.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

#include <fstream>
#include <random>

using namespace rillstrand;
using Catch::Matchers::Contains;
using Catch::Matchers::WithinAbs;

namespace {

geo::PointsXY points(std::initializer_list<std::array<double, 2>> list) {
    geo::PointsXY xy(static_cast<Eigen::Index>(list.size()), 2);
    Eigen::Index i = 0;
    for (const auto& p : list)
        xy.row(i++) << p[0], p[1];
    return xy;
}

} // namespace

// G-41 to G-43: a polyline with a 3-4-5 piece, by hand.
TEST_CASE("measures and projections on a polyline by hand", "[geo]") {
    const geo::Polyline line{points({{0, 0}, {100, 0}, {100, 100}, {300, 250}}), {}};
    CHECK(line.measures()(1) == 100.0);
    CHECK(line.measures()(2) == 200.0);
    CHECK(line.length_m() == 450.0);
    CHECK((line.at(150.0) - Eigen::Vector2d{100, 50}).norm() < 1e-12);
    CHECK((line.at(325.0) - Eigen::Vector2d{200, 175}).norm() < 1e-12);
    const auto right = line.nearest(110.0, 60.0);
    CHECK_THAT(right.measure_m, WithinAbs(160.0, 1e-12));
    CHECK_THAT(right.offset_m, WithinAbs(10.0, 1e-12));
    const auto left = line.nearest(190.0, 190.0);
    CHECK_THAT(left.measure_m, WithinAbs(326.0, 1e-9));
    CHECK_THAT(left.offset_m, WithinAbs(-18.0, 1e-9));
}

// G-47: 385 m horizontal on a slope of 5 % are 385.480949 m along the ground.
TEST_CASE("with heights lengths are along the slope", "[geo]") {
    Eigen::ArrayXd z(2);
    z << 0.0, 0.05 * 385.0;
    const geo::Polyline line{points({{0, 0}, {385, 0}}), z};
    CHECK(line.along_slope());
    CHECK_THAT(line.length_m(), WithinAbs(385.480949, 1e-6));
    CHECK_FALSE(geo::Polyline{points({{0, 0}, {385, 0}}), {}}.along_slope());
}

// G-20 to G-24: EPSG method 9621, ED50/UTM 31N to ETRS89/UTM 31N; IOGP Guidance Note 7-2, p. 140,
// and Catalan mapping institute (2010).
TEST_CASE("a similarity transform is found from published pairs", "[geo][published]") {
    const auto from =
        points({{300000, 4500000}, {315000, 4740000}, {520000, 4680000}, {420000, 4600000}});
    const auto to = points({{299905.060, 4499796.515},
                            {314906.904, 4739796.774},
                            {519906.767, 4679795.125},
                            {419906.005, 4599795.760}});
    const auto fit = geo::fit_similarity(from, to, Eigen::ArrayXd::Ones(4));
    CHECK_THAT(fit.scale, WithinAbs(1.0000015523, 1e-9));
    CHECK_THAT(-fit.rotation_rad * 180.0 / 3.14159265358979 * 3600.0, WithinAbs(1.564996, 1e-3));
    CHECK((fit.apply(from) - to).matrix().rowwise().norm().maxCoeff() < 0.0003);
}

TEST_CASE("control points that cannot tell are refused", "[geo]") {
    CHECK_THROWS_WITH(
        geo::fit_similarity(points({{1, 1}}), points({{2, 2}}), Eigen::ArrayXd::Ones(1)),
        Contains("give at least two"));
    CHECK_THROWS_WITH(geo::fit_similarity(points({{1, 1}, {1, 1}}), points({{2, 2}, {2, 2}}),
                                          Eigen::ArrayXd::Ones(2)),
                      Contains("all lie at one place"));
}

TEST_CASE("parts that meet are joined, parts that do not are refused", "[geo]") {
    const std::string file = std::string{RILLSTRAND_SCRATCH} + "/parts.geojson";
    const auto write = [&file](const std::string& second) {
        std::ofstream{file} << R"({"type":"FeatureCollection","features":[
            {"type":"Feature","properties":{},"geometry":{"type":"LineString","coordinates":[[9.1,47.60],[9.1,47.61]]}},
            {"type":"Feature","properties":{},"geometry":{"type":"LineString","coordinates":)" +
                                   second + "}}]}";
    };
    write("[[9.1,47.63],[9.1,47.61]]"); // the other way round
    const auto line = geo::read_line(file, "EPSG:4326", "placement.route");
    CHECK(line.lonlat(0, 1) == Approx(47.60));
    CHECK(line.lonlat(line.lonlat.rows() - 1, 1) == Approx(47.63));
    write("[[9.2,47.63],[9.2,47.61]]");
    CHECK_THROWS_WITH(geo::read_line(file, "EPSG:4326", "placement.route"),
                      Contains("its 2 line parts do not meet"));
}

// Against brute force over many small steps: the nearest place is the nearest of all places.
TEST_CASE("the nearest place of random lines is nearer than any sampled one", "[geo][property]") {
    std::mt19937_64 random{31};
    std::uniform_real_distribution<double> any{0.0, 100.0};
    for (int round = 0; round < 50; ++round) {
        geo::PointsXY xy(12, 2);
        for (Eigen::Index i = 0; i < 12; ++i)
            xy.row(i) << any(random), any(random);
        const geo::Polyline line{xy, {}};
        const Eigen::Vector2d p{any(random), any(random)};
        const auto found = line.nearest(p.x(), p.y());
        double least = 1e9;
        for (double m = 0.0; m <= line.length_m(); m += 0.05)
            least = std::min(least, (line.at(m) - p).norm());
        CHECK(std::abs(found.offset_m) <= least + 1e-9);
        CHECK_THAT((line.at(found.measure_m) - p).norm(),
                   WithinAbs(std::abs(found.offset_m), 1e-9));
    }
}

TEST_CASE("coils are taken out and the cable turns back at the turnaround", "[geo]") {
    campaign::Campaign campaign;
    campaign.placement.emplace();
    campaign.placement->turnaround_m = 500.0;
    campaign.stretches.push_back({"coil", campaign::Setting::coil, 100.0, 130.0, 0.0, {}});
    const geo::FibreMap map{campaign};
    CHECK(map.path_m(90.0) == 90.0);
    CHECK(map.path_m(100.0) == map.path_m(130.0));
    CHECK(map.path_m(115.0) == 100.0);
    CHECK(map.path_m(230.0) == 200.0);
    CHECK(map.path_m(500.0) == 470.0);
    CHECK(map.path_m(600.0) == 370.0);
    CHECK(map.leg(499.0) == 1);
    CHECK(map.leg(501.0) == 2);
}

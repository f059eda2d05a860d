// SPDX-License-Identifier: Apache-2.0
#include "crs.hpp"

#include "base/error.hpp"

#include <catch2/catch.hpp>

using namespace rillstrand;
using Catch::Matchers::WithinAbs;

namespace {

Eigen::Array2d project(const std::string& crs, double lon, double lat) {
    // Longitude and latitude on the system's own ellipsoid: no change of datum.
    const geo::Crs target{crs, "test"};
    const std::string base =
        crs.find("+ellps") != std::string::npos || crs.find("+a=") != std::string::npos
            ? "+proj=longlat " +
                  crs.substr(crs.find("+ellps"), 40)
                      .substr(0, crs.substr(crs.find("+ellps"), 40).find(' ')) +
                  " +type=crs"
            : "EPSG:4326";
    const geo::Transformation transformation{geo::Crs{base, "test"}, target};
    geo::PointsXY point(1, 2);
    point << lon, lat;
    return transformation.forward(point).row(0).transpose();
}

double dms(double d, double m, double s) {
    return d + m / 60.0 + s / 3600.0;
}

} // namespace

// IOGP Guidance Note 7-2 (report 373-07-02, 2019), pp. 54-55; printed 6-8 mm from what PROJ gives.
// G-01.
TEST_CASE("the British grid's worked examples", "[geo][published]") {
    const std::string grid =
        "+proj=tmerc +lat_0=49 +lon_0=-2 +k=0.9996012717 +x_0=400000 +y_0=-100000 "
        "+ellps=airy +units=m +no_defs +type=crs";
    const auto a = project(grid, 0.5, 50.5);
    CHECK_THAT(a(0), WithinAbs(577274.99, 0.011));
    CHECK_THAT(a(1), WithinAbs(69740.50, 0.011));
    // Ordnance Survey, A guide to coordinate systems in Great Britain, worked example. G-02.
    const auto b = project(grid, dms(1, 43, 4.5177), dms(52, 39, 27.2531));
    CHECK_THAT(b(0), WithinAbs(651409.903, 0.001));
    CHECK_THAT(b(1), WithinAbs(313177.270, 0.001));
}

// IOGP Guidance Note 7-2, Lambert conic examples. G-03, G-04.
TEST_CASE("Lambert conic worked examples", "[geo][published]") {
    const double us_foot = 1200.0 / 3937.0;
    const auto texas =
        project("+proj=lcc +lat_0=27.8333333333333 +lon_0=-99 +lat_1=28.3833333333333 "
                "+lat_2=30.2833333333333 +x_0=609601.219202438 +y_0=0 +ellps=clrk66 +units=m "
                "+no_defs +type=crs",
                -96.0, 28.5);
    CHECK_THAT(texas(0) / us_foot, WithinAbs(2963503.91, 0.01));
    CHECK_THAT(texas(1) / us_foot, WithinAbs(254759.80, 0.01));
    const auto jamaica =
        project("+proj=lcc +lat_1=18 +lat_0=18 +lon_0=-77 +k_0=1 +x_0=250000 +y_0=150000 "
                "+ellps=clrk66 +units=m +no_defs +type=crs",
                -dms(76, 56, 37.26), dms(17, 55, 55.80));
    CHECK_THAT(jamaica(0), WithinAbs(255966.58, 0.005));
    CHECK_THAT(jamaica(1), WithinAbs(142493.51, 0.005));
}

// G-05 to G-08: Universal Transverse Mercator on WGS 84, computed with PROJ 9.1 and mirrored.
TEST_CASE("UTM coordinates, x is easting whatever the axis order", "[geo][published]") {
    const double printed = 1e-5;
    const auto a = project("EPSG:32632", 6.0, 49.7), b = project("EPSG:32631", 6.0, 49.7);
    CHECK_THAT(a(0), WithinAbs(283679.941621, printed));
    CHECK_THAT(a(1), WithinAbs(5509597.198147, printed));
    CHECK_THAT(a(0) + b(0), WithinAbs(1e6, printed));
    const auto c = project("EPSG:32633", 12.0, 84.0);
    CHECK_THAT(c(0), WithinAbs(465005.344939, printed));
    const auto d = project("EPSG:32759", 170.5, -43.6);
    CHECK_THAT(d(1), WithinAbs(5172431.284732, printed));
    const auto e = project("EPSG:32632", 9.0, 0.0);
    CHECK_THAT(e(0), WithinAbs(500000.0, 1e-6));
    CHECK_THAT(e(1), WithinAbs(0.0, 1e-6));
}

// G-30: Karney, GeodTest (Zenodo 32156, CC0), line 1. G-32: one degree on WGS 84. G-33: grid is not
// ground.
TEST_CASE("lengths are geodesics", "[geo][published]") {
    CHECK_THAT(geo::geodesic_m(0.0, 36.530042355041, 5.762344694676510456, -48.164270779097768864),
               WithinAbs(9398502.0434687, 1e-6));
    CHECK_THAT(geo::geodesic_m(0.0, 0.0, 1.0, 0.0), WithinAbs(111319.490793, 1e-6));
    CHECK_THAT(geo::geodesic_m(0.0, 45.0, 0.0, 46.0), WithinAbs(111141.548474, 1e-6));
    CHECK_THAT(geo::geodesic_m(6.0, 49.7, 6.008, 49.705), WithinAbs(801.440781, 1e-6));
}

TEST_CASE("the ground plane keeps lengths where a grid does not", "[geo][property]") {
    geo::PointsXY lonlat(2, 2);
    lonlat << 6.0, 49.7, 6.008, 49.705;
    const geo::GroundPlane plane{lonlat, 0.0};
    const auto xy = plane.from_lonlat(lonlat);
    const double length_m = (xy.row(1) - xy.row(0)).matrix().norm();
    CHECK_THAT(length_m, WithinAbs(801.440781, 1e-4));
    const auto back = plane.to_lonlat(xy);
    CHECK((back - lonlat).abs().maxCoeff() < 1e-11);
    // At 2500 m the ground is longer by 2500 / 6371000.
    const auto high = geo::GroundPlane{lonlat, 2500.0}.from_lonlat(lonlat);
    CHECK_THAT((high.row(1) - high.row(0)).matrix().norm() / length_m, WithinAbs(1.0003924, 1e-7));
}

TEST_CASE("what is no coordinate system is refused with an example", "[geo]") {
    CHECK_THROWS_WITH(
        (geo::Crs{"EPSG:999999", "placement.crs"}),
        "placement.crs: 'EPSG:999999' is no known coordinate system; write an EPSG code such "
        "as EPSG:25832, or WKT");
    CHECK_THROWS_AS((geo::Crs{"", "placement.crs"}), DataError);
    CHECK(geo::Crs{"EPSG:4326", "x"}.geographic());
    CHECK_FALSE(geo::Crs{"EPSG:25832", "x"}.geographic());
}

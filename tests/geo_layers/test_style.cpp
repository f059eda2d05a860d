// SPDX-License-Identifier: Apache-2.0
#include "geo_layers/sample_layers.hpp"

#include "style.hpp"

#include <catch2/catch.hpp>

#include <Eigen/Core>

#include <cmath>
#include <fstream>
#include <limits>
#include <random>

using namespace rillstrand;
using namespace rillstrand::geo;

namespace {
double linear(std::uint8_t value) {
    const double v = value / 255.0; // IEC 61966-2-1
    return v <= 0.04045 ? v / 12.92 : std::pow((v + 0.055) / 1.055, 2.4);
}

Eigen::Vector3d linear_rgb(Rgb c) {
    return {linear(c.r), linear(c.g), linear(c.b)};
}

/// CIE 1976 L*a*b* of linear sRGB, white D65 (CIE 15:2004).
Eigen::Vector3d lab(const Eigen::Vector3d& rgb) {
    const Eigen::Matrix3d to_xyz{{0.4124564, 0.3575761, 0.1804375},
                                 {0.2126729, 0.7151522, 0.0721750},
                                 {0.0193339, 0.1191920, 0.9503041}};
    const Eigen::Vector3d xyz = to_xyz * rgb;
    const auto f = [](double t) {
        return t > 216.0 / 24389.0 ? std::cbrt(t) : (24389.0 / 27.0 * t + 16.0) / 116.0;
    };
    const double fx = f(xyz.x() / 0.95047), fy = f(xyz.y()), fz = f(xyz.z() / 1.08883);
    return {116.0 * fy - 16.0, 500.0 * (fx - fy), 200.0 * (fy - fz)};
}

/// How the colour looks to an eye without one kind of cone: Machado, Oliveira & Fernandes (2009),
/// IEEE Trans. Vis. Comput. Graph. 15, 1291-1298, severity 1, from memory.
Eigen::Vector3d seen_by(const Eigen::Matrix3d& eye, Rgb c) {
    return (eye * linear_rgb(c)).cwiseMax(0.0).cwiseMin(1.0);
}
const Eigen::Matrix3d no_red_cones{{0.152286, 1.052583, -0.204868},
                                   {0.114503, 0.786281, 0.099216},
                                   {-0.003882, -0.048116, 1.051998}};
const Eigen::Matrix3d no_green_cones{{0.367322, 0.860646, -0.227968},
                                     {0.280085, 0.672501, 0.047413},
                                     {-0.011820, 0.042940, 0.968881}};

double smallest_step(const std::vector<Rgb>& colours, const Eigen::Matrix3d& eye) {
    double smallest = 1e9;
    for (std::size_t i = 0; i < colours.size(); ++i)
        for (std::size_t j = 0; j < i; ++j)
            smallest = std::min(
                smallest, (lab(seen_by(eye, colours[i])) - lab(seen_by(eye, colours[j]))).norm());
    return smallest;
}

bool passes(const std::string& command) {
    return std::system((command + " > /dev/null 2>&1").c_str()) ==
           0; // NOLINT: a test's own command
}
} // namespace

// IEC 61966-2-1 and CIE 15: white, black and mid grey of L* = 50 is sRGB 119 (widely tabulated).
TEST_CASE("colours of L*a*b* come out in sRGB", "[style][published]") {
    CHECK(rgb_from_lab(100.0, 0.0, 0.0) == Rgb{255, 255, 255});
    CHECK(rgb_from_lab(0.0, 0.0, 0.0) == Rgb{0, 0, 0});
    CHECK(rgb_from_lab(50.0, 0.0, 0.0) == Rgb{119, 119, 119});
    CHECK(hex({0, 114, 178}) == "#0072b2");
}

TEST_CASE("ramps are even to the eye and safe for colour-blind ones", "[style][property]") {
    for (const auto& colours : {sequential_colours(7), diverging_colours(7)}) {
        double least = 1e9, most = 0.0;
        for (std::size_t i = 1; i < colours.size(); ++i) {
            const double step =
                (lab(linear_rgb(colours[i])) - lab(linear_rgb(colours[i - 1]))).norm();
            least = std::min(least, step);
            most = std::max(most, step);
        }
        const double rounding_to_bytes = 1.03;
        const double arms_of_one_ramp = 1.35; // blue and orange are not equally far from white
        CHECK(most / least < rounding_to_bytes * arms_of_one_ramp);
        // A difference of 10 is seen at a glance; 2.3 is just noticeable (Mahy et al. 1994).
        CHECK(smallest_step(colours, no_red_cones) > 8.0);
        CHECK(smallest_step(colours, no_green_cones) > 8.0);
    }
    const auto run = sequential_colours(9);
    for (std::size_t i = 1; i < run.size(); ++i) // also in a black and white print
        CHECK(lab(linear_rgb(run[i])).x() > lab(linear_rgb(run[i - 1])).x() + 5.0);
    const auto names = categorical_colours(8);
    CHECK(smallest_step(names, no_red_cones) > 8.0);
    CHECK(smallest_step(names, no_green_cones) > 8.0);
}

TEST_CASE("classes follow the data", "[style][property]") {
    const double nan = std::numeric_limits<double>::quiet_NaN();
    CHECK(class_limits({nan, nan}, 5, false).empty());
    CHECK(class_limits({4.0}, 5, false) == std::vector<double>{4.0, 4.0});
    CHECK(class_limits({0.5, 3.5, 6.2, 9.5, nan}, 5, false) ==
          std::vector<double>{0.5, 2.0, 4.0, 6.0, 8.0, 9.5});
    std::mt19937 random{11};
    for (int trial = 0; trial < 200; ++trial) {
        std::lognormal_distribution<double> skewed{0.0, 0.02 * trial};
        std::vector<double> values(50 + static_cast<std::size_t>(trial));
        for (double& v : values)
            v = skewed(random) * std::pow(10.0, trial % 13 - 6);
        const auto limits = class_limits(values, 7, false);
        REQUIRE(limits.size() >= 2);
        CHECK(limits.size() <= 8);
        CHECK(std::is_sorted(limits.begin(), limits.end()));
        CHECK(limits.front() == *std::min_element(values.begin(), values.end()));
        CHECK(limits.back() == *std::max_element(values.begin(), values.end()));
        for (std::size_t i = 0; i + 1 < limits.size(); ++i) {
            const auto inside = std::count_if(values.begin(), values.end(), [&](double v) {
                return v >= limits[i] && v < limits[i + 1];
            });
            CHECK(inside <= static_cast<std::ptrdiff_t>(values.size() / 2 + 1));
        }
        for (double& v : values)
            v = std::log(v);
        const auto around_zero = class_limits(values, 7, true);
        REQUIRE(around_zero.size() == 8);
        for (std::size_t i = 0; i < 4; ++i)
            CHECK(around_zero[i] == Approx(-around_zero[7 - i]).margin(1e-12));
        for (const double v : values)
            CHECK(std::abs(v) <= around_zero.back());
    }
}

TEST_CASE("every row has a class and a colour", "[style][property]") {
    for (const auto& layer : sample::layer_set().layers) {
        const auto style = make_style(layer);
        for (std::size_t row = 0; row < layer.table.rows(); ++row)
            CHECK(matching_class(style, layer.table, row).has_value());
    }
}

TEST_CASE("the finding is in the colour, its uncertainty in the halo", "[style][property]") {
    Table table{"inflows"};
    table.add_real("fibre_m", "fibre distance", "m", {1.0, 2.0, 3.0, 4.0});
    table.add_real("fraction", "share", "1", {0.1, 0.2, 0.3, 0.4});
    table.add_real("fraction_sd", "sd of the share", "1", {0.01, 0.02, 0.05, 0.09});
    const std::vector<double> x{0.0, 1.0, 2.0, 3.0};
    const Layer layer = point_layer(std::move(table), GeometryKind::point, x, x);
    const Look look = complete_look(layer);
    CHECK(look.colour_by == "fraction");
    CHECK(look.halo_by == "fraction_sd");
    CHECK(look.waypoints);
    const auto style = make_style(layer);
    REQUIRE(style.halos.size() >= 2);
    for (std::size_t i = 0; i < style.halos.size(); ++i) {
        CHECK(style.halos[i].column == "fraction_sd");
        CHECK(style.halos[i].size_px > style.classes.front().size_px);
        if (i > 0)
            CHECK(style.halos[i].size_px > style.halos[i - 1].size_px);
    }
    CHECK(style.classes.front().column == "fraction");
}

// OGC 05-078r4 and 05-077r4: element names and order; read by an XML parser that knows namespaces.
TEST_CASE("styles are well-formed and hold no markup of names", "[style][property]") {
    const auto folder = sample::fresh_folder("styles");
    for (const auto& layer : sample::layer_set().layers) {
        if (layer.geometry == GeometryKind::none)
            continue;
        Look look = complete_look(layer);
        if (layer.table.name() == "channels")
            look.colour_by = "stretch"; // the hostile names
        const auto style = make_style(layer.table, layer.geometry, look);
        std::ofstream{folder / "style.sld"} << to_sld(style);
        std::ofstream{folder / "style.qml"} << to_qml(style);
        CHECK(passes(std::string{"/usr/bin/python3 "} + RILLSTRAND_TEST_DATA + "/check_style.py " +
                     (folder / "style.sld").string() + " " + (folder / "style.qml").string()));
        CHECK(to_sld(style).find("<script>") == std::string::npos);
        CHECK(to_qml(style).find("<script>") == std::string::npos);
    }
}

TEST_CASE("a day's layer can be played in time", "[style][property]") {
    const auto layers = sample::layer_set().layers;
    const auto style =
        make_style(layers[4].table, GeometryKind::point, {"state", "", "date", "", false, false});
    CHECK(style.time_by == "date");
    CHECK(to_qml(style).find("startField=\"date\"") != std::string::npos);
    CHECK(style.classes.size() == 4); // snow, bare, unknown, no value
}

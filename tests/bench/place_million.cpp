// SPDX-License-Identifier: Apache-2.0
// Times the placement of a million channels: rillstrand_place_million CAMPAIGN_FOLDER; prints
// seconds of each of its parts, the best of five. tests/bench/placement.py makes the folder and the
// references.
#include "campaign/read.hpp"
#include "crs.hpp"
#include "placement.hpp"
#include "route.hpp"

#include <algorithm>
#include <chrono>
#include <cstdio>
#include <filesystem>
#include <limits>

namespace {

using namespace rillstrand;

template <class Work> double best_s(const Work& work) {
    double best = std::numeric_limits<double>::infinity();
    for (int k = 0; k < 5; ++k) {
        const auto begin = std::chrono::steady_clock::now();
        work();
        const std::chrono::duration<double> took = std::chrono::steady_clock::now() - begin;
        best = std::min(best, took.count());
    }
    return best;
}

} // namespace

int main(int argc, char** argv) {
    if (argc != 2) {
        std::fputs("place_million CAMPAIGN_FOLDER\n", stderr);
        return 2;
    }
    const std::filesystem::path folder{argv[1]};
    const campaign::Campaign campaign = campaign::read_campaign(folder / "campaign.toml");
    constexpr Eigen::Index n = 1'000'000;
    const Eigen::ArrayXd fibre_m = Eigen::ArrayXd::LinSpaced(n, 10.0, 99'990.0);
    Eigen::Index placed = 0;
    const double whole = best_s([&] {
        const geo::Placement placement = geo::place(campaign, fibre_m, nullptr);
        placed = n - placement.unplaced;
    });

    const geo::LineFromFile line =
        geo::read_line(folder / "route.geojson", "EPSG:4326", "placement.route");
    const geo::GroundPlane plane{line.lonlat, std::numeric_limits<double>::quiet_NaN()};
    const geo::Polyline route{plane.from_lonlat(line.lonlat), {}};
    const Eigen::ArrayXd measures = Eigen::ArrayXd::LinSpaced(n, 0.0, route.length_m());
    geo::PointsXY xy(n, 2);
    const double along = best_s([&] { xy = route.at_all(measures); });
    const geo::Crs utm{"EPSG:25832", "utm"}, wgs84{"EPSG:4326", "wgs84"};
    const geo::Transformation to_wgs84{utm, wgs84};
    geo::PointsXY grid(n, 2);
    grid.col(0) = xy.col(0) + 512'000.0;
    grid.col(1) = xy.col(1) + 5'278'000.0;
    geo::PointsXY lonlat;
    const double transform = best_s([&] { lonlat = to_wgs84.forward(grid); });
    std::printf("{\"placed\": %td, \"place_s\": %.4f, \"along_s\": %.4f, \"transform_s\": %.4f}\n",
                placed, whole, along, transform);
    return 0;
}

// SPDX-License-Identifier: Apache-2.0
// Makes the demo campaign: an invented summer in an invented valley, written as an instrument and a
// surveyor would hand it over, with the truth beside it.
#include "physics/stream_physics.hpp"

#include "base/text.hpp"
#include "crs.hpp"

#include <nlohmann/json.hpp>

#include <cmath>
#include <filesystem>
#include <fstream>
#include <iostream>
#include <numbers>

namespace fs = std::filesystem;
using namespace rillstrand;

namespace {

constexpr double start_s = 1940803200.0; // 2031-07-02T20:00:00Z
constexpr double lead_in_m = 100.0;      // fibre before the reach: baths and air
constexpr double ice_from_m = 20.0, ice_to_m = 45.0, warm_from_m = 55.0, warm_to_m = 80.0;
constexpr double warm_degC = 24.0;
constexpr double survey_sd_m = 1.2;

/// The invented Harrowbeck: a reach of 1100 m.
physics::Stream harrowbeck() {
    physics::Stream stream;
    stream.length_m = 1100.0;
    stream.discharge_m3s = 0.040;
    stream.light = 0.6;
    stream.lights = {{420.0, 640.0, 0.15}}; // a wood with sharp edges
    stream.inflows = {{"spring under the alder", 180.0, 0.0042, 9.4, 0.0, 16.0, 4.0, 0.0, false},
                      {"seep at the boulder", 395.0, 0.0011, 9.4, 0.0, 16.0, 2.0, 0.0, false},
                      {"mill outlet", 560.0, 0.0050, 15.5, 3.0, 17.0, 5.0, 0.0, true},
                      {"spring in the meadow", 745.0, 0.0026, 9.4, 0.0, 16.0, 3.0, 0.0, false},
                      {"seep below the ford", 930.0, 0.0080, 9.4, 0.0, 16.0, 4.0, 0.0, false}};
    stream.gains = {{820.0, 890.0, 0.0022, 9.4}};
    return stream;
}

physics::Cable cable_in_it() {
    physics::Cable cable;
    cable.start_fibre_m = lead_in_m;
    cable.slack_low = 0.01;
    cable.slack_high = 0.05;
    cable.interval_s = 300.0;
    cable.noise_K = 0.08;
    using Kind = physics::Patch::Kind;
    cable.patches = {{Kind::spot, 300.0, 301.5, 0.6, 9.4},
                     {Kind::dry, 500.0, 512.0, 0.8, 10.0},
                     {Kind::sunlit, 680.0, 700.0, 1.0, 10.0}};
    return cable;
}

/// A winding line in the valley, in UTM zone 32.
class Valley {
public:
    Valley(double length_m, std::mt19937_64& random) {
        std::uniform_real_distribution<double> phase{0.0, 2.0 * std::numbers::pi};
        const double a = phase(random), b = phase(random), c = phase(random);
        double x = 512000.0, y = 5278000.0;
        for (double s = 0.0; s <= length_m + step_m; s += step_m) {
            m_points.emplace_back(x, y);
            const double heading = 0.5 + 0.5 * std::sin(s / 140.0 + a) +
                                   0.45 * std::sin(s / 47.0 + b) + 0.3 * std::sin(s / 19.0 + c);
            x += step_m * grid_scale * std::cos(heading);
            y += step_m * grid_scale * std::sin(heading);
        }
    }
    Eigen::Vector2d at(double s) const {
        const double k = std::clamp(s / step_m, 0.0, static_cast<double>(m_points.size()) - 1.001);
        const auto i = static_cast<std::size_t>(k);
        const double w = k - static_cast<double>(i);
        return (1.0 - w) * m_points[i] + w * m_points[i + 1];
    }

private:
    static constexpr double step_m = 0.25;
    static constexpr double grid_scale = 0.9996; // near the zone's middle; the valley lies low
    std::vector<Eigen::Vector2d> m_points;
};

void write(const fs::path& path, const std::string& text) {
    fs::create_directories(path.parent_path());
    std::ofstream file{path, std::ios::binary};
    file << text;
    file.close();
    if (!file)
        throw std::runtime_error{path.string() + ": cannot be written"};
}

/// What the cable reads before the reach: baths and air, through the same response and noise.
double lead_in_degC(double fibre_m, double air_degC) {
    const auto inside = [fibre_m](double from_m, double to_m) {
        constexpr double sigma_m = 1.0 / 2.3548; // Gaussian of 1 m full width at half maximum
        return 0.5 * (std::erf((fibre_m - from_m) / (sigma_m * std::numbers::sqrt2)) -
                      std::erf((fibre_m - to_m) / (sigma_m * std::numbers::sqrt2)));
    };
    const double ice = inside(ice_from_m, ice_to_m), warm = inside(warm_from_m, warm_to_m);
    return warm * warm_degC + (1.0 - ice - warm) * air_degC;
}

void write_traces(const fs::path& folder, const physics::Record& record, std::mt19937_64& random) {
    std::normal_distribution<double> noise{0.0, 0.08};
    std::string wanted;
    for (Eigen::Index i = 0; i < record.time_s.size(); ++i) {
        const std::string stamp = text::iso_time(record.time_s(i));
        std::string trace =
            "# Harrowbeck, channel 1\n# acquired " + stamp + "\ndistance,temperature\n";
        for (double f = 0.0; f < lead_in_m - 0.25; f += 0.5)
            trace += text::fixed(f, 2) + "," +
                     text::fixed(lead_in_degC(f, record.air_degC(i)) + noise(random), 2) + "\n";
        for (Eigen::Index j = 0; j < record.fibre_m.size(); ++j) {
            const auto value = static_cast<double>(record.temperature_degC(i, j));
            trace += text::fixed(record.fibre_m(j), 2) + "," +
                     (std::isnan(value) ? "" : text::fixed(value, 2)) + "\n";
        }
        std::string name = stamp.substr(0, 19);
        for (char& c : name)
            if (c == ':')
                c = '-';
        write(folder / "traces" / ("trace_" + name + ".csv"), trace);
    }
}

nlohmann::ordered_json truth_of(const physics::Record& record, const physics::Cable& cable,
                                const Valley& valley) {
    nlohmann::ordered_json truth;
    for (const auto& in : record.inflows)
        truth["inflows"].push_back({{"label", in.inflow.label},
                                    {"surface_water", in.inflow.surface_water},
                                    {"fibre_m", in.fibre_m},
                                    {"fraction", in.fraction},
                                    {"discharge_m3s", in.inflow.discharge_m3s},
                                    {"temperature_c", in.temperature_degC}});
    for (const auto& gain : record.gains)
        truth["gains"].push_back({{"fibre_from_m", gain.fibre_from_m},
                                  {"fibre_to_m", gain.fibre_to_m},
                                  {"fraction", gain.fraction},
                                  {"discharge_m3s", gain.gain.discharge_m3s}});
    for (const auto& patch : cable.patches)
        if (patch.kind == physics::Patch::Kind::spot)
            truth["spots"].push_back(
                {{"fibre_m", physics::fibre_at(record, 0.5 * (patch.from_m + patch.to_m))}});
    for (double s = 5.0; s < 1095.0; s += 5.0) {
        const Eigen::Vector2d at = valley.at(s);
        truth["positions"].push_back(
            {{"fibre_m", physics::fibre_at(record, s)}, {"x", at.x()}, {"y", at.y()}});
    }
    truth["baths"] = {{{"name", "ice bath"}, {"temperature_c", 0.0}},
                      {{"name", "warm bath"}, {"temperature_c", warm_degC}}};
    return truth;
}

void write_survey(const fs::path& folder, const physics::Record& record, const Valley& valley,
                  std::mt19937_64& random) {
    std::normal_distribution<double> receiver{0.0, survey_sd_m}, mark{0.0, 0.2}, hand{0.0, 0.4};
    std::string ties = "fibre_m,x,y,sd_m,label\n";
    int number = 1;
    for (double s = 2.0; s < 1100.0; s += 84.0) {
        const Eigen::Vector2d at = valley.at(s);
        ties += text::fixed(physics::fibre_at(record, s) + mark(random), 2) + "," +
                text::fixed(at.x() + receiver(random), 2) + "," +
                text::fixed(at.y() + receiver(random), 2) + "," + text::fixed(survey_sd_m, 1) +
                ",peg " + std::to_string(number++) + "\n";
    }
    write(folder / "tie_points.csv", ties);
    const geo::Transformation to_wgs84{geo::Crs{"EPSG:25832", "demo"},
                                       geo::Crs{"EPSG:4326", "demo"}};
    nlohmann::ordered_json line = nlohmann::ordered_json::array();
    for (double s = 0.0; s <= 1100.0; s += 4.0) {
        geo::PointsXY xy(1, 2);
        const Eigen::Vector2d at = valley.at(s);
        xy << at.x() + hand(random), at.y() + hand(random);
        const geo::PointsXY lonlat = to_wgs84.forward(xy);
        line.push_back({lonlat(0, 0), lonlat(0, 1)});
    }
    const nlohmann::ordered_json route{
        {"type", "FeatureCollection"},
        {"features",
         {{{"type", "Feature"},
           {"properties", {{"name", "Harrowbeck"}}},
           {"geometry", {{"type", "LineString"}, {"coordinates", line}}}}}}};
    write(folder / "route.geojson", route.dump(1) + "\n");
}

void write_side_series(const fs::path& folder, const physics::Record& record) {
    std::string mill = "time,t_c\n", bath = "time,warm_c\n";
    for (Eigen::Index i = 0; i < record.time_s.size(); i += 2) {
        const std::string stamp = text::iso_time(record.time_s(i));
        for (const auto& in : record.inflows)
            if (in.inflow.surface_water)
                mill += stamp + "," + text::fixed(in.series_degC(i), 2) + "\n";
        bath += stamp + "," + text::fixed(warm_degC, 2) + "\n";
    }
    write(folder / "mill.csv", mill);
    write(folder / "baths.csv", bath);
}

void write_campaign(const fs::path& folder, const physics::Record& record) {
    double mill_m = 0.0;
    for (const auto& in : record.inflows)
        if (in.inflow.surface_water)
            mill_m = in.fibre_m;
    std::string toml = R"([campaign]
name = "Harrowbeck, summer low flow"
summary = "Three days of an invented stream in an invented valley"
creator = "The demo of rillstrand"
licence = "CC0-1.0"
keywords = ["stream temperature", "groundwater inflow"]

[record]
files = ["traces/*.csv"]

[[bath]]
name = "ice bath"
from_m = 20.0
to_m = 45.0
temperature_c = 0.0
temperature_sd_c = 0.02
[[bath]]
name = "warm bath"
from_m = 55.0
to_m = 80.0
probe = { file = "baths.csv", column = "warm_c" }
temperature_sd_c = 0.02

[[stretch]]
name = "reach"
setting = "streambed"
)";
    toml += "from_m = " + text::fixed(record.from_fibre_m, 1) +
            "\nto_m = " + text::fixed(record.to_fibre_m, 1) + R"(

[placement]
crs = "EPSG:25832"
tie_points = "tie_points.csv"
route = "route.geojson"

[[stream]]
stretch = "reach"
flow = "increasing"
inflow_temperature_c = 9.4
inflow_temperature_sd_c = 0.1
discharge_at = "upstream"
discharge_m3s = 0.0400
discharge_sd_m3s = 0.0015
[[stream.known]]
label = "mill outlet"
)";
    toml += "fibre_m = " + text::fixed(mill_m, 0) + R"(
temperature = { file = "mill.csv", column = "t_c" }
)";
    write(folder / "campaign.toml", toml);
}

} // namespace

int main(int argc, char** argv) {
    if (argc < 2 || argc > 3) {
        std::cerr << "rillstrand_demo FOLDER [SEED]\n";
        return 2;
    }
    try {
        const fs::path folder = argv[1];
        std::mt19937_64 random{argc == 3 ? std::stoull(argv[2]) : 20310702ULL};
        const physics::Cable cable = cable_in_it();
        const physics::Record record = physics::simulate(harrowbeck(), cable, start_s, 3.0, random);
        const Valley valley{1100.0, random};
        write_traces(folder, record, random);
        write_survey(folder, record, valley, random);
        write_side_series(folder, record);
        write_campaign(folder, record);
        write(folder / "truth.json", truth_of(record, cable, valley).dump(1) + "\n");
        std::cout << "made " << folder.string() << ": " << record.time_s.size() << " traces of "
                  << record.fibre_m.size() + 200 << " channels\n";
    } catch (const std::exception& error) {
        std::cerr << error.what() << '\n';
        return 3;
    }
    return 0;
}

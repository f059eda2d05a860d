// SPDX-License-Identifier: Apache-2.0
// Writes a page of an invented campaign with hostile names: make_page FILE.
#include "page.hpp"

#include <nlohmann/json.hpp>

#include <cmath>
#include <fstream>
#include <string>

using Json = nlohmann::ordered_json;

namespace {

constexpr int rows = 288, columns = 300;
const std::string hostile =
    "<script>window.hit=1</script>\"'& \u202eabc {{data}} " + std::string(200, 'x');

double temperature(int i, int j) {
    const double sun = std::sin(2.0 * M_PI * i / 144.0);
    return 12.0 + 3.0 * sun - (j > 180 ? 0.12 * (2.4 + 3.0 * sun) : 0.0);
}

Json picture() {
    std::string bytes;
    Json times = Json::array(), places = Json::array();
    for (int i = 0; i < rows; ++i) {
        times.push_back(1932595200 + 600 * i + (i > 150 ? 14400 : 0));
        for (int j = 0; j < columns; ++j) {
            const auto code =
                static_cast<unsigned>(std::lround((temperature(i, j) - 8.0) / 8.0 * 65534.0));
            bytes += static_cast<char>(code & 255U);
            bytes += static_cast<char>(code >> 8U);
        }
    }
    for (int j = 0; j < columns; ++j)
        places.push_back(100 + j);
    return {
        {"rows", rows},      {"columns", columns},     {"low_c", 8.0},
        {"high_c", 16.0},    {"time_s", times},        {"fibre_m", places},
        {"traces_a_row", 1}, {"channels_a_column", 1}, {"codes", rillstrand::page::base64(bytes)}};
}

Json channels() {
    Json c;
    for (int j = 0; j < columns; ++j) {
        const double mean = j > 180 ? 11.7 : 12.0;
        c["fibre_m"].push_back(100 + j);
        c["mean_c"].push_back(mean);
        c["p05_c"].push_back(mean - 2.9);
        c["p95_c"].push_back(mean + 2.9);
        c["daily_range_c"].push_back(6.0);
        c["noise_c"].push_back(0.03 + 1e-4 * j);
        c["stretch"].push_back(hostile);
        c["flag"].push_back("");
        c["lon"].push_back(9.0 + 1e-5 * j);
        c["lat"].push_back(47.0 + 3e-4 * std::sin(j / 40.0));
        c["position_sd_m"].push_back(0.4);
    }
    return c;
}

} // namespace

int main(int argc, char** argv) {
    if (argc != 2)
        return 2;
    const Json inflow{{"kind", "step"},       {"fibre_m", 281.0},     {"fraction", 0.12},
                      {"fraction_sd", 0.011}, {"temperature_c", 9.6}, {"temperature_sd_c", 0.2},
                      {"contrast_c", -2.4},   {"score", 18.2},        {"position_sd_m", 1.1}};
    const Json bare_reach{
        {"stretch", "side arm"}, {"inflows", Json::array()}, {"detection_limit_fraction", 0.021}};
    const Json findings{
        {"campaign", {{"name", hostile}}},
        {"record",
         {{"first", "2031-03-30T00:00:00Z"},
          {"last", "2031-04-01T00:00:00Z"},
          {"traces", rows},
          {"channels", columns}}},
        {"quality",
         {{"noise_c", 0.04}, {"baths", {{{"name", hostile}, {"bias_c", 0.01}, {"rmse_c", 0.04}}}}}},
        {"placement", {{"crs", "EPSG:25832"}, {"position_sd_m", 0.4}}},
        {"stream",
         {{{"stretch", hostile}, {"inflows", {inflow}}, {"detection_limit_fraction", 0.014}},
          bare_reach}},
        {"cautions", {hostile}}};
    const Json data{{"channels", channels()},
                    {"streams", Json::array()},
                    {"findings", findings},
                    {"picture", picture()},
                    {"inflows", {inflow}}};
    std::ofstream(argv[1]) << rillstrand::page::render(hostile, data.dump());
    return 0;
}

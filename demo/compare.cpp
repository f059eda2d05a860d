// SPDX-License-Identifier: Apache-2.0
// Holds the demo's findings against the truth it was made from, in words.
#include "base/text.hpp"
#include "record/delimited.hpp"

#include <nlohmann/json.hpp>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <iostream>

using namespace rillstrand;
using Json = nlohmann::json;

namespace {

Json read(const std::filesystem::path& file) {
    std::ifstream stream{file};
    return Json::parse(stream);
}

double number(const Json& value) {
    return value.is_number() ? value.get<double>() : std::nan("");
}

std::string percent(double share) {
    return text::fixed(100.0 * share, 2) + " %";
}

class Comparison {
public:
    Comparison(const Json& truth, const Json& findings) : m_truth{truth} {
        for (const auto& reach : findings.at("stream"))
            for (const auto& in : reach.at("inflows"))
                m_found.push_back(in);
        m_used.assign(m_found.size(), false);
    }

    void tell_inflows() {
        for (const auto& in : m_truth.at("inflows")) {
            const double at_m = in.at("fibre_m"), share = in.at("fraction");
            const std::string what = in.at("label").get<std::string>() + " at " +
                                     text::fixed(at_m, 1) + " m, " + percent(share) + ": ";
            const std::size_t k = nearest(at_m, 8.0, {"step"});
            if (k == m_found.size()) {
                std::cout << "  " << what << "not found\n";
                continue;
            }
            const Json& found = m_found[k];
            const double got = number(found.at("fraction")), sd = number(found.at("fraction_sd"));
            std::cout << "  " << what << "found at " << text::fixed(found.at("fibre_m"), 1)
                      << " m with ";
            if (std::isnan(got))
                std::cout << "no resolvable share";
            else
                std::cout << percent(got) << " ± " << percent(sd) << ", off by "
                          << text::fixed(std::abs(got - share) / sd, 1) << " sd";
            std::cout << (in.at("surface_water").get<bool>() && found.at("known").get<bool>()
                              ? ", told apart as surface water\n"
                              : "\n");
        }
        for (const auto& spot : m_truth.at("spots")) {
            const double at_m = spot.at("fibre_m");
            const std::size_t k = nearest(at_m, 5.0, {"spot"});
            std::cout << "  spot at " << text::fixed(at_m, 1)
                      << " m: " << (k == m_found.size() ? "not found" : "found as a spot") << '\n';
        }
        for (const auto& gain : m_truth.at("gains"))
            tell_gain(gain);
        const auto left = std::count(m_used.begin(), m_used.end(), false);
        std::cout << "  found and not there: " << left << '\n';
        for (std::size_t k = 0; k < m_found.size(); ++k)
            if (!m_used[k])
                std::cout << "    " << m_found[k].at("kind").get<std::string>() << " at "
                          << text::fixed(m_found[k].at("fibre_m"), 1) << " m\n";
    }

private:
    std::size_t nearest(double at_m, double within_m, const std::vector<std::string>& kinds) {
        std::size_t best = m_found.size();
        double least_m = within_m;
        for (std::size_t k = 0; k < m_found.size(); ++k) {
            const std::string kind = m_found[k].at("kind");
            const double apart_m = std::abs(number(m_found[k].at("fibre_m")) - at_m);
            if (m_used[k] || std::find(kinds.begin(), kinds.end(), kind) == kinds.end() ||
                apart_m > least_m)
                continue;
            least_m = apart_m;
            best = k;
        }
        if (best < m_found.size())
            m_used[best] = true;
        return best;
    }

    void tell_gain(const Json& gain) {
        const double from_m = gain.at("fibre_from_m"), to_m = gain.at("fibre_to_m");
        std::cout << "  gaining stretch from " << text::fixed(from_m, 0) << " to "
                  << text::fixed(to_m, 0) << " m, " << percent(gain.at("fraction")) << ": ";
        const std::size_t k =
            nearest(0.5 * (from_m + to_m), 0.5 * (to_m - from_m) + 20.0, {"diffuse"});
        if (k == m_found.size())
            std::cout << "not found\n";
        else
            std::cout << "found from " << text::fixed(number(m_found[k].at("fibre_from_m")), 0)
                      << " to " << text::fixed(number(m_found[k].at("fibre_to_m")), 0) << " m with "
                      << percent(number(m_found[k].at("fraction"))) << " ± "
                      << percent(number(m_found[k].at("fraction_sd"))) << '\n';
    }

    const Json& m_truth;
    std::vector<Json> m_found;
    std::vector<bool> m_used;
};

void tell_positions(const Json& truth, const std::filesystem::path& channels_csv) {
    const record::Delimited table = record::read_delimited(channels_csv);
    const std::size_t fibre = *table.column("fibre_m"), x = *table.column("x"),
                      y = *table.column("y"), sd = *table.column("position_sd_m");
    std::vector<double> errors_m;
    double inside = 0.0;
    std::size_t row = 0;
    for (const auto& place : truth.at("positions")) {
        const double at_m = place.at("fibre_m");
        while (row + 1 < table.rows.size() && *table.number(row, fibre) < at_m)
            ++row;
        const auto px = table.number(row, x), py = table.number(row, y),
                   psd = table.number(row, sd);
        if (!px || !py || !psd)
            continue;
        errors_m.push_back(
            std::hypot(*px - place.at("x").get<double>(), *py - place.at("y").get<double>()));
        if (errors_m.back() < 2.0 * *psd)
            inside += 1.0;
    }
    std::sort(errors_m.begin(), errors_m.end());
    const auto n = static_cast<double>(errors_m.size());
    std::cout << "Positions: median error " << text::fixed(errors_m[errors_m.size() / 2], 2)
              << " m, 95 % within " << text::fixed(errors_m[errors_m.size() * 95 / 100], 2)
              << " m; " << text::fixed(100.0 * inside / n, 0) << " % inside twice the stated sd\n";
}

} // namespace

int main(int argc, char** argv) {
    if (argc != 3) {
        std::cerr << "rillstrand_compare TRUTH.json FINDINGS.json\n";
        return 2;
    }
    try {
        const Json truth = read(argv[1]), findings = read(argv[2]);
        std::cout << "Against the truth that the demo was made from:\n";
        Comparison{truth, findings}.tell_inflows();
        tell_positions(truth,
                       std::filesystem::path{argv[2]}.parent_path() / "tables" / "channels.csv");
        for (const auto& bath : findings.at("quality").at("baths"))
            std::cout << "Bath '" << bath.at("name").get<std::string>() << "': bias "
                      << text::fixed(number(bath.at("bias_c")), 3) << " K of a truth of 0.000 K\n";
    } catch (const std::exception& error) {
        std::cerr << error.what() << '\n';
        return 3;
    }
    return 0;
}

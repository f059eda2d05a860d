// SPDX-License-Identifier: Apache-2.0
#include "bed_tables.hpp"

#include "base/text.hpp"
#include "heat/ground.hpp"

#include <cmath>
#include <functional>

namespace rillstrand::app {

namespace {

using Reals = std::vector<double>;
using bed::FluxRow;
using heat::day_s;

Reals column(const std::vector<FluxRow>& rows, const std::function<double(const FluxRow&)>& get) {
    Reals values;
    values.reserve(rows.size());
    for (const auto& row : rows)
        values.push_back(get(row));
    return values;
}

void add_fluxes(Table& table, const std::vector<FluxRow>& rows) {
    std::vector<std::string> methods, flags;
    for (const auto& row : rows) {
        methods.push_back(row.method);
        flags.push_back(row.flag);
    }
    table.add_time("time", "middle of the window",
                   column(rows, [](const FluxRow& r) { return r.time_s; }));
    table.add_text("method",
                   "how the flux was told: fit, joint, amplitude, phase (size only) or "
                   "steady",
                   std::move(methods));
    table.add_real("flux_ms", "flux of water, mean over the window, positive down", "m s-1",
                   column(rows, [](const FluxRow& r) { return r.flux_m_s; }));
    table.add_real("flux_sd_ms", "its standard deviation", "m s-1",
                   column(rows, [](const FluxRow& r) { return r.flux_sd_m_s; }));
    table.add_real("diffusivity_m2s", "thermal diffusivity that the method found", "m2 s-1",
                   column(rows, [](const FluxRow& r) { return r.diffusivity_m2_s; }));
    table.add_real("diffusivity_sd_m2s", "its standard deviation", "m2 s-1",
                   column(rows, [](const FluxRow& r) { return r.diffusivity_sd_m2_s; }));
    table.add_real("flux_md", "flux of water in metres a day, positive down", "m d-1",
                   column(rows, [](const FluxRow& r) { return day_s * r.flux_m_s; }), 5);
    table.add_real("flux_sd_md", "its standard deviation", "m d-1",
                   column(rows, [](const FluxRow& r) { return day_s * r.flux_sd_m_s; }), 5);
    table.add_real("window_h", "length of the window", "h",
                   column(rows, [](const FluxRow& r) { return r.window_s / 3600.0; }), 2);
    table.add_real("upper_depth_m", "upper depth that it stands on", "m",
                   column(rows, [](const FluxRow& r) { return r.upper_m; }), 4);
    table.add_real("lower_depth_m", "lower depth that it stands on", "m",
                   column(rows, [](const FluxRow& r) { return r.lower_m; }), 4);
    table.add_text("flag", "why to doubt it, empty where nothing speaks against it",
                   std::move(flags));
}

Table series_table(const bed::BedFindings& found, double datum_fibre_m) {
    Table table{"bed_" + text::slug(found.name),
                "Flux of water through the streambed at '" + found.name + "', positive down"};
    add_fluxes(table, found.series);
    table.add_real("fibre_m", "fibre distance of the bed's surface", "m",
                   Reals(found.series.size(), datum_fibre_m), 3);
    return table;
}

Table methods_table(const Session& session) {
    Table table{"beds_methods", "Flux through streambeds by every method, the best first"};
    std::vector<FluxRow> rows;
    std::vector<std::string> names;
    std::vector<bool> best;
    for (const auto& found : session.beds)
        for (const auto& row : found.methods) {
            rows.push_back(row);
            names.push_back(found.name);
            best.push_back(row.method == found.method);
        }
    table.add_text("bed", "name of the bed", std::move(names));
    table.add_boolean("best", "whether this is the bed's best method", best);
    add_fluxes(table, rows);
    return table;
}

Table depths_table(const Session& session) {
    Table table{"beds_depths", "The daily wave by depth in streambeds, medians over the record"};
    std::vector<bed::DepthWave> depths;
    std::vector<std::string> names, uses;
    for (const auto& found : session.beds)
        for (const auto& d : found.depths) {
            depths.push_back(d);
            names.push_back(found.name);
            uses.push_back(d.use);
        }
    const auto real = [&](const char* name, const char* title, const char* unit,
                          double bed::DepthWave::*part, int decimals) {
        Reals values;
        for (const auto& d : depths)
            values.push_back(d.*part);
        table.add_real(name, title, unit, std::move(values), decimals);
    };
    table.add_text("bed", "name of the bed", std::move(names));
    real("fibre_m", "fibre distance from the instrument", "m", &bed::DepthWave::fibre_m, 3);
    real("depth_m", "depth under the bed's surface", "m", &bed::DepthWave::depth_m, 4);
    real("mean_c", "mean temperature", "degC", &bed::DepthWave::mean_degC, 4);
    real("noise_c", "white noise of one averaged sample", "K", &bed::DepthWave::noise_K, 4);
    real("amplitude_c", "amplitude of the daily wave", "K", &bed::DepthWave::amplitude_K, 4);
    real("amplitude_sd_c", "its standard deviation", "K", &bed::DepthWave::amplitude_sd_K, 4);
    real("phase_rad", "phase of its peak after midnight UTC", "rad", &bed::DepthWave::phase_rad, 4);
    real("phase_sd_rad", "its standard deviation", "rad", &bed::DepthWave::phase_sd_rad, 4);
    real("second_amplitude_c", "amplitude of the wave of half a day", "K",
         &bed::DepthWave::second_amplitude_K, 4);
    real("trend_cd", "trend", "K d-1", &bed::DepthWave::trend_K_d, 4);
    table.add_text("use", "what the channel was used for, or why it was not", std::move(uses));
    return table;
}

/// Rows of one bed out of a table of all.
Json rows_of(const Table& table, const std::string& name) {
    Json own = Json::array();
    for (auto& row : rows_json(table))
        if (row.at("bed") == name) {
            row.erase("bed");
            own.push_back(std::move(row));
        }
    return own;
}

std::string method_words(const bed::BedFindings& f) {
    if (f.method == "fit")
        return "Conduction and advection fitted to all depths at once: flux changes in time, "
               "properties by depth stay near the stated ones, sd from noise, properties and "
               "depths together. Each row is the mean over its window. A fibre on a winding is a "
               "mean over its height, so this is the flux of one place, not of the reach.";
    if (f.method == "joint")
        return "Daily wave at two depths, amplitude and phase together; steady flux within each "
               "window is assumed.";
    if (f.method == "amplitude")
        return "Amplitudes of the daily wave at two depths with the stated diffusivity; steady "
               "flux within each window is assumed.";
    if (f.method == "steady")
        return "Bend of the mean profile with the stated conductivity; steady state is assumed.";
    return "No method tells a flux.";
}

} // namespace

std::vector<Table> bed_tables(const Session& session) {
    std::vector<Table> tables;
    if (session.beds.empty())
        return tables;
    for (std::size_t i = 0; i < session.beds.size(); ++i)
        tables.push_back(series_table(session.beds[i], session.campaign.beds[i].datum_fibre_m));
    tables.push_back(methods_table(session));
    tables.push_back(depths_table(session));
    return tables;
}

Json bed_json(const Session& session) {
    Json list = Json::array();
    if (session.beds.empty())
        return list;
    const Table methods = methods_table(session), depths = depths_table(session);
    for (std::size_t i = 0; i < session.beds.size(); ++i) {
        const bed::BedFindings& f = session.beds[i];
        const campaign::Bed& c = session.campaign.beds[i];
        list.push_back({{"name", f.name},
                        {"stretch", f.stretch},
                        {"method", f.method},
                        {"window_s", number_json(f.window_s)},
                        {"window_h", number_json(f.window_s / 3600.0)},
                        {"positive", "down"},
                        {"flux_ms", number_json(f.mean_flux_m_s)},
                        {"flux_sd_ms", number_json(f.mean_flux_sd_m_s)},
                        {"flux_md", number_json(day_s * f.mean_flux_m_s)},
                        {"flux_sd_md", number_json(day_s * f.mean_flux_sd_m_s)},
                        {"diffusivity_m2s", number_json(f.diffusivity_m2_s)},
                        {"diffusivity_sd_m2s", number_json(f.diffusivity_sd_m2_s)},
                        {"noise_c", number_json(f.noise_K)},
                        {"resolution_s", number_json(f.knot_s)},
                        {"fibre_per_height", number_json(f.fibre_per_height)},
                        {"averaging_height_m", number_json(f.averaging_height_m)},
                        {"stated",
                         {{"thermal_conductivity_wmk", c.thermal_conductivity_wmk},
                          {"heat_capacity_jm3k", c.heat_capacity_jm3k},
                          {"porosity", c.porosity}}},
                        {"trusted_sd",
                         {{"thermal_conductivity", f.trust.conductivity},
                          {"thermal_conductivity_layer", f.trust.conductivity_layer},
                          {"heat_capacity", f.trust.capacity},
                          {"heat_capacity_layer", f.trust.capacity_layer},
                          {"depth_scale", f.trust.depth_scale}}},
                        {"series", rows_json(series_table(f, c.datum_fibre_m))},
                        {"methods", rows_of(methods, f.name)},
                        {"depths", rows_of(depths, f.name)},
                        {"evidence", f.evidence},
                        {"warnings", warnings_json(f.warnings)},
                        {"explanation", method_words(f)}});
    }
    return list;
}

void tell_beds(const Session& session, std::ostream& out) {
    for (const auto& f : session.beds) {
        out << "bed '" << f.name << "': ";
        if (!std::isfinite(f.mean_flux_m_s)) {
            out << "no method tells a flux\n";
            continue;
        }
        out << "flux " << text::fixed(day_s * f.mean_flux_m_s, 3) << " ± "
            << text::fixed(day_s * f.mean_flux_sd_m_s, 3) << " m/d (positive down, mean of "
            << f.series.size() << " windows of " << text::fixed(f.window_s / 3600.0, 0)
            << " h, method " << f.method << ")\n";
    }
}

} // namespace rillstrand::app

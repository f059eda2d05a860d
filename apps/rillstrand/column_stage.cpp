// SPDX-License-Identifier: Apache-2.0
#include "column_stage.hpp"

#include "base/text.hpp"
#include "record/bin.hpp"
#include "record/side_series.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <set>

namespace rillstrand::app {

namespace {

Eigen::ArrayXd series_at(const Session& session, const campaign::SideSeries& where,
                         const record::BinnedRecord& binned, Warnings& warnings) {
    const auto values = record::read_side_series(where, session.campaign.record);
    warnings.insert(warnings.end(), values.warnings.begin(), values.warnings.end());
    return record::mean_over_intervals(values, binned.time_s, binned.bin_s,
                                       record::usual_gap_s(values));
}

column::ColumnInput column_input(Session& session, const campaign::Column& config,
                                 const Context& context) {
    const campaign::Stretch& stretch = *session.campaign.find_stretch(config.stretch);
    const auto range = record::places_between(session.axes(), stretch.from_m, stretch.to_m);
    // Half an hour follows an internal wave and quietens the noise.
    const double bin_s = record::choose_bin_s(session.axes(), range.count, 1800.0, 200e6);
    const auto binned = record::bin(*session.source, range, bin_s, context.progress);
    column::ColumnInput input;
    input.time_s = binned.time_s;
    input.bin_s = binned.bin_s;
    input.fibre_m = binned.distance_m;
    input.temperature_degC = binned.mean_degC;
    input.samples = binned.count;
    const Eigen::Index traces = std::min<Eigen::Index>(session.axes().n_time(), 600);
    input.single_degC.resize(traces, range.count);
    session.source->read(record::Quantity::temperature, 0, range.first, input.single_degC);
    input.spatial_response_m = session.spatial_response_m;
    input.config = config;
    if (config.water_level)
        input.level_m = series_at(session, *config.water_level, binned, session.warnings);
    else if (config.water_level_m)
        input.level_m = Eigen::ArrayXd::Constant(binned.time_s.size(), *config.water_level_m);
    if (config.hypsograph)
        input.lake = column::read_hypsograph(*config.hypsograph);
    if (config.wind)
        input.wind_ms = series_at(session, *config.wind, binned, session.warnings);
    return input;
}

/// One attribute of every row.
template <class Row, class Value>
std::vector<double> collect(const std::vector<Row>& rows, Value Row::*member) {
    std::vector<double> out;
    out.reserve(rows.size());
    for (const Row& row : rows)
        out.push_back(row.*member);
    return out;
}

Table series_table(const column::ColumnFindings& found) {
    using State = column::ColumnState;
    const auto& rows = found.series;
    Table table{"column_" + text::slug(found.name),
                "Layers of the water column '" + found.name + "' through time"};
    std::vector<std::string> state;
    std::vector<std::int64_t> in_air;
    for (const auto& row : rows) {
        state.push_back(row.stratification);
        in_air.push_back(row.channels_in_air);
    }
    table.add_time("time", "middle of the mean, UTC", collect(rows, &State::time_s));
    table.add_text("stratification", "stratified, inverse, mixed, or why nothing is known", state);
    const auto real = [&](const char* name, const char* title, const char* unit,
                          double State::*member, int decimals) {
        table.add_real(name, title, unit, collect(rows, member), decimals);
    };
    real("mixed_layer_depth_m", "depth where density is 0.1 kg m-3 over that of 0.1 to 0.4 m", "m",
         &State::mixed_layer_depth_m, 3);
    real("mixed_layer_depth_sd_m", "its standard deviation", "m", &State::mixed_layer_depth_sd_m,
         3);
    real("thermocline_depth_m", "depth of the steepest density gradient", "m",
         &State::thermocline_depth_m, 3);
    real("thermocline_depth_sd_m", "its standard deviation", "m", &State::thermocline_depth_sd_m,
         3);
    real("metalimnion_top_m", "where the gradient falls under the least one, upwards", "m",
         &State::metalimnion_top_m, 3);
    real("metalimnion_bottom_m", "where the gradient falls under the least one, downwards", "m",
         &State::metalimnion_bottom_m, 3);
    real("max_gradient_cm", "steepest temperature gradient, over 0.5 m, below 1.5 m", "K m-1",
         &State::max_gradient_cm, 4);
    real("temperature_step_depth_m", "its depth", "m", &State::temperature_step_depth_m, 3);
    real("max_density_gradient_kgm4", "steepest density gradient, over 0.5 m", "kg m-4",
         &State::max_density_gradient, 5);
    real("buoyancy_frequency_max_s1", "greatest buoyancy frequency", "s-1",
         &State::buoyancy_frequency_max_s1, 6);
    real("schmidt_stability_jm2", "Schmidt stability", "J m-2", &State::schmidt_stability_jm2, 3);
    real("schmidt_stability_sd_jm2", "its standard deviation", "J m-2",
         &State::schmidt_stability_sd_jm2, 3);
    real("heat_content_jm2", "heat over 0 degC", "J m-2", &State::heat_content_jm2, 0);
    real("heat_content_sd_jm2", "its standard deviation", "J m-2", &State::heat_content_sd_jm2, 0);
    real("lake_number", "Lake Number", "1", &State::lake_number, 4);
    real("wedderburn_number", "Wedderburn Number", "1", &State::wedderburn_number, 4);
    real("surface_c", "temperature at the surface", "degC", &State::surface_c, 3);
    real("bottom_c", "temperature at the deepest channel", "degC", &State::bottom_c, 3);
    real("level_m", "elevation of the surface", "m", &State::level_m, 3);
    table.add_integer("channels_in_air", "channels above the surface, left out", in_air);
    return table;
}

Table isotherm_table(const column::ColumnFindings& found) {
    using Isotherm = column::Isotherm;
    Table table{"column_" + text::slug(found.name) + "_isotherms",
                "Depths of temperatures in the water column '" + found.name + "'"};
    table.add_time("time", "middle of the mean, UTC", collect(found.isotherms, &Isotherm::time_s));
    table.add_real("temperature_c", "temperature", "degC",
                   collect(found.isotherms, &Isotherm::temperature_c), 2);
    table.add_real("depth_m", "first depth below the surface where it stands", "m",
                   collect(found.isotherms, &Isotherm::depth_m), 3);
    return table;
}

/// Value of a channel's attribute at the channel nearest to a fibre distance.
Eigen::Index nearest_channel(const Session& session, double fibre_m) {
    const Eigen::ArrayXd& d = session.axes().distance_m;
    const auto next = std::lower_bound(d.begin(), d.end(), fibre_m) - d.begin();
    if (next == 0)
        return 0;
    if (next == d.size())
        return d.size() - 1;
    return fibre_m - d(next - 1) < d(next) - fibre_m ? next - 1 : next;
}

Table profile_table(const Session& session, const column::ColumnFindings& found) {
    using Point = column::ProfilePoint;
    const auto& rows = found.profiles;
    Table table{"column_" + text::slug(found.name) + "_profiles",
                "Fitted temperatures of the water column '" + found.name + "' by depth and time"};
    table.add_time("time", "middle of the mean, UTC", collect(rows, &Point::time_s));
    table.add_real("fibre_m", "fibre distance from the instrument", "m",
                   collect(rows, &Point::fibre_m), 2);
    table.add_real("depth_m", "depth below the surface", "m", collect(rows, &Point::depth_m), 3);
    table.add_real("temperature_c", "temperature", "degC", collect(rows, &Point::temperature_c), 3);
    table.add_real("temperature_sd_c", "its standard deviation", "K",
                   collect(rows, &Point::temperature_sd_c), 4);
    if (!session.placement)
        return table;
    const geo::ChannelPositions& c = session.placement->channels;
    std::vector<double> sd, x, y, z, lon, lat;
    for (const Point& row : rows) {
        const Eigen::Index j = nearest_channel(session, row.fibre_m);
        sd.push_back(c.position_sd_m(j));
        x.push_back(c.x(j));
        y.push_back(c.y(j));
        z.push_back(std::isnan(row.elevation_m) ? c.z(j) : row.elevation_m);
        lon.push_back(c.lon(j));
        lat.push_back(c.lat(j));
    }
    table.add_real("position_sd_m", "horizontal position error, root mean square", "m", sd, 2);
    table.add_real("x", "easting or longitude", "", x, 8);
    table.add_real("y", "northing or latitude", "", y, 8);
    table.add_real("z", "elevation", "m", z, 2);
    table.add_real("lon", "longitude, WGS 84", "degrees_east", lon, 8);
    table.add_real("lat", "latitude, WGS 84", "degrees_north", lat, 8);
    return table;
}

Table diffusivity_table(const column::ColumnFindings& found) {
    using Row = column::Diffusivity;
    const auto& rows = found.diffusivity;
    Table table{"column_" + text::slug(found.name) + "_diffusivity",
                "Vertical diffusivity in the water column '" + found.name + "', flux-gradient"};
    table.add_time("from", "begin, UTC", collect(rows, &Row::from_s));
    table.add_time("to", "end, UTC", collect(rows, &Row::to_s));
    table.add_real("depth_m", "depth below the surface", "m", collect(rows, &Row::depth_m), 2);
    table.add_real("diffusivity_m2s", "vertical diffusivity", "m2 s-1",
                   collect(rows, &Row::diffusivity_m2s));
    table.add_real("diffusivity_sd_m2s", "its standard deviation", "m2 s-1",
                   collect(rows, &Row::diffusivity_sd_m2s));
    return table;
}

} // namespace

void check_columns(const campaign::Campaign& campaign, Problems& problems) {
    std::set<std::string> names;
    for (const auto& column : campaign.columns) {
        if (!names.insert(text::slug(column.name)).second)
            problems.add(campaign.place(column.where) + ": a second column is named '" +
                         column.name + "' in tables and layers; rename one");
        try {
            if (column.hypsograph)
                (void)column::read_hypsograph(*column.hypsograph);
        } catch (const DataError& error) {
            problems.add(error);
        }
    }
}

void column_stage(Session& session, const Context& context) {
    for (const auto& config : session.campaign.columns) {
        const column::ColumnInput input = column_input(session, config, context);
        context.progress.stage("fitting profiles of '" + config.name + "'",
                               static_cast<double>(input.time_s.size()), "profiles");
        session.columns.push_back(column::interpret(input));
        const Warnings& warnings = session.columns.back().warnings;
        session.warnings.insert(session.warnings.end(), warnings.begin(), warnings.end());
    }
}

void add_column_tables(const Session& session, Tables& tables) {
    for (const auto& found : session.columns) {
        tables.all.push_back(series_table(found));
        tables.all.push_back(isotherm_table(found));
        tables.all.push_back(profile_table(session, found));
        if (!found.diffusivity.empty())
            tables.all.push_back(diffusivity_table(found));
    }
}

Json column_json(const Session& session, const Tables& tables) {
    Json list = Json::array();
    for (const auto& found : session.columns) {
        const std::string table = "column_" + text::slug(found.name);
        Json overturns = Json::array();
        for (const double time_s : found.overturn_s)
            overturns.push_back(text::iso_time(time_s));
        const Table* diffusivity = tables.find(table + "_diffusivity");
        list.push_back(
            {{"name", found.name},
             {"stretch", found.stretch},
             {"series", rows_json(*tables.find(table))},
             {"overturns", overturns},
             {"internal_wave_period_h", number_json(found.internal_wave_period_h)},
             {"diffusivity", diffusivity == nullptr ? Json::array() : rows_json(*diffusivity)},
             {"stability_and_heat", found.stability_area},
             {"density", found.density_source},
             {"height_per_fibre", number_json(found.height_per_fibre)},
             {"vertical_averaging_sd_m", number_json(found.kernel_sd_m)},
             {"method", found.method}});
    }
    return list;
}

Json column_pictures(const Session& session) {
    Json list = Json::array();
    const auto numbers = [](const std::vector<double>& values, int decimals) {
        Json out = Json::array();
        for (const double value : values)
            out.push_back(std::isnan(value) ? Json{} : Json::parse(text::fixed(value, decimals)));
        return out;
    };
    for (const auto& found : session.columns) {
        using Point = column::ProfilePoint;
        using Isotherm = column::Isotherm;
        list.push_back(
            {{"name", found.name},
             {"time_s", numbers(collect(found.profiles, &Point::time_s), 0)},
             {"depth_m", numbers(collect(found.profiles, &Point::depth_m), 2)},
             {"temperature_c", numbers(collect(found.profiles, &Point::temperature_c), 2)},
             {"isotherms",
              {{"time_s", numbers(collect(found.isotherms, &Isotherm::time_s), 0)},
               {"temperature_c", numbers(collect(found.isotherms, &Isotherm::temperature_c), 1)},
               {"depth_m", numbers(collect(found.isotherms, &Isotherm::depth_m), 2)}}}});
    }
    return list;
}

void tell_columns(const Session& session, std::ostream& out) {
    for (const auto& found : session.columns) {
        double layered = 0.0, known = 0.0, depth = 0.0;
        for (const auto& state : found.series) {
            known += std::isnan(state.surface_c) ? 0.0 : 1.0;
            if (std::isnan(state.thermocline_depth_m))
                continue;
            layered += 1.0;
            depth += state.thermocline_depth_m;
        }
        out << "column '" << found.name << "': stratified "
            << text::fixed(100.0 * layered / std::max(1.0, known), 0) << " % of the time";
        if (layered > 0.0)
            out << ", thermocline at " << text::fixed(depth / layered, 2) << " m on average";
        if (std::isfinite(found.internal_wave_period_h))
            out << ", internal wave of " << text::fixed(found.internal_wave_period_h, 1) << " h";
        out << '\n';
    }
}

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#include "pipeline.hpp"

#include "adjust_stage.hpp"
#include "bed_stage.hpp"
#include "column_stage.hpp"
#include "findings_json.hpp"
#include "layer_tables.hpp"
#include "page_data.hpp"
#include "quality_events.hpp"
#include "snow_stage.hpp"

#include "base/text.hpp"
#include "record/bin.hpp"
#include "record/side_series.hpp"
#include "store/gather.hpp"
#include "store/metadata.hpp"
#include "store/open.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::app {

namespace {

std::string setting_word(campaign::Setting setting) {
    switch (setting) {
    case campaign::Setting::streambed:
        return "streambed";
    case campaign::Setting::ground:
        return "ground";
    case campaign::Setting::water:
        return "water";
    case campaign::Setting::air:
        return "air";
    case campaign::Setting::coil:
        return "coil";
    case campaign::Setting::bath:
        return "bath";
    }
    return {};
}

void name_channels(Session& session) {
    const auto n = static_cast<std::size_t>(session.axes().n_place());
    ChannelNames& names = session.names;
    names.stretch.assign(n, "");
    names.setting.assign(n, "");
    names.flag.assign(n, "ok");
    const auto take = [&](const std::string& name, const std::string& setting, double from_m,
                          double to_m) {
        const auto range = record::places_between(session.axes(), from_m, to_m);
        for (Eigen::Index j = range.first; j < range.first + range.count; ++j) {
            names.stretch[static_cast<std::size_t>(j)] = name;
            names.setting[static_cast<std::size_t>(j)] = setting;
        }
    };
    const auto inner = [](const campaign::Stretch& s) {
        return s.setting == campaign::Setting::coil || s.setting == campaign::Setting::bath;
    };
    for (const bool second : {false, true})
        for (const auto& s : session.campaign.stretches)
            if (inner(s) == second)
                take(s.name, setting_word(s.setting), s.from_m, s.to_m);
    for (const auto& b : session.campaign.baths)
        take(b.name, "bath", b.from_m, b.to_m);
}

void flag_channels(Session& session) {
    const record::ScanSummary& scan = *session.scan;
    std::vector<double> noise;
    for (const double value : scan.noise_K)
        if (std::isfinite(value))
            noise.push_back(value);
    double usual_K = NAN;
    if (!noise.empty()) {
        const auto middle = noise.begin() + static_cast<std::ptrdiff_t>(noise.size() / 2);
        std::nth_element(noise.begin(), middle, noise.end());
        usual_K = *middle;
    }
    const auto n_time = static_cast<double>(session.axes().n_time());
    for (Eigen::Index j = 0; j < scan.n.size(); ++j) {
        std::string& flag = session.names.flag[static_cast<std::size_t>(j)];
        if (scan.n(j) == 0.0)
            flag = "dead";
        else if (scan.n(j) < 0.5 * n_time)
            flag = "sparse";
        else if (scan.noise_K(j) > 5.0 * usual_K && scan.noise_K(j) > 0.2)
            flag = "noisy";
    }
}

Eigen::Index count_flag(const Session& session, const char* flag) {
    return std::count(session.names.flag.begin(), session.names.flag.end(), flag);
}

stream::Series series_of(const Session& session, const campaign::SideSeries& where) {
    const auto values = record::read_side_series(where, session.campaign.record);
    return {values.time_s, values.value};
}

std::vector<stream::Exclusion> exclusions_of(const Session& session,
                                             const campaign::Stretch& reach) {
    std::vector<stream::Exclusion> excluded;
    const auto overlaps = [&](double from_m, double to_m) {
        return from_m < reach.to_m && to_m > reach.from_m;
    };
    for (const auto& s : session.campaign.stretches)
        if (s.name != reach.name && overlaps(s.from_m, s.to_m))
            excluded.push_back({s.from_m, s.to_m, s.name});
    for (const auto& b : session.campaign.baths)
        if (overlaps(b.from_m, b.to_m))
            excluded.push_back({b.from_m, b.to_m, b.name});
    for (Eigen::Index j = 0; j < session.axes().n_place(); ++j) {
        const std::string& flag = session.names.flag[static_cast<std::size_t>(j)];
        const double at_m = session.axes().distance_m(j);
        if ((flag == "dead" || flag == "noisy") && overlaps(at_m, at_m))
            excluded.push_back({at_m, at_m, flag + " channel"});
    }
    return excluded;
}

/// Mean temperature of a stretch through time, for a tributary that the cable saw.
stream::Series stretch_series(const Session& session, const std::string& name, double bin_s,
                              const Context& context) {
    const auto* stretch = session.campaign.find_stretch(name);
    const auto range = record::places_between(session.axes(), stretch->from_m, stretch->to_m);
    const auto binned = record::bin(*session.source, range, bin_s, context.progress);
    stream::Series series{binned.time_s, Eigen::ArrayXd(binned.time_s.size())};
    for (Eigen::Index i = 0; i < binned.time_s.size(); ++i) {
        double sum = 0.0, n = 0.0;
        for (Eigen::Index j = 0; j < binned.mean_degC.cols(); ++j)
            if (!std::isnan(binned.mean_degC(i, j))) {
                sum += static_cast<double>(binned.mean_degC(i, j));
                n += 1.0;
            }
        series.value(i) = n > 0.0 ? sum / n : std::numeric_limits<double>::quiet_NaN();
    }
    return series;
}

stream::StreamInput stream_input(const Session& session, const campaign::Stream& config,
                                 const Context& context) {
    const campaign::Stretch& reach = *session.campaign.find_stretch(config.stretch);
    const auto range = record::places_between(session.axes(), reach.from_m, reach.to_m);
    // A quarter of an hour follows the day's wave; longer bins only where memory asks for them.
    const double bin_s = record::choose_bin_s(session.axes(), range.count, 900.0, 300e6);
    const auto binned = record::bin(*session.source, range, bin_s, context.progress);
    stream::StreamInput input;
    input.time_s = binned.time_s;
    input.interval_s = binned.bin_s;
    input.fibre_m = binned.distance_m;
    input.temperature_degC = binned.mean_degC.cast<double>();
    input.spatial_response_m = session.spatial_response_m;
    input.excluded = exclusions_of(session, reach);
    input.config = config;
    if (session.placement) {
        input.longitude_deg = session.placement->first_lon;
        input.latitude_deg = session.placement->first_lat;
    }
    if (config.inflow_temperature)
        input.inflow_temperature_degC = series_of(session, *config.inflow_temperature);
    if (config.discharge)
        input.discharge_m3s = series_of(session, *config.discharge);
    for (const auto& known : config.known) {
        stream::KnownWater water{known.label, known.fibre_m, std::nullopt};
        if (known.temperature)
            water.temperature_degC = series_of(session, *known.temperature);
        if (known.temperature_stretch)
            water.temperature_degC =
                stretch_series(session, *known.temperature_stretch, bin_s, context);
        input.known.push_back(water);
    }
    return input;
}

store::Positions positions_of(const geo::Placement& placement) {
    const geo::ChannelPositions& c = placement.channels;
    store::Positions positions{c.lon,
                               c.lat,
                               c.x,
                               c.y,
                               c.z,
                               c.position_sd_m,
                               c.station_m,
                               placement.output_wkt,
                               placement.output_crs};
    if (!c.z.isFinite().any())
        positions.z_m.resize(0);
    if (!c.station_m.isFinite().any())
        positions.station_m.resize(0);
    return positions;
}

void describe_record(const Session& session, const std::filesystem::path& record_nc,
                     const std::string& now) {
    if (session.placement)
        store::add_positions(record_nc, positions_of(*session.placement));
    store::ChannelQuality quality;
    quality.noise_c = session.scan->noise_K;
    quality.flag_meanings = {"ok", "dead", "sparse", "noisy", "no_position"};
    for (const auto& flag : session.names.flag) {
        const auto found =
            std::find(quality.flag_meanings.begin(), quality.flag_meanings.end(), flag);
        quality.flag.push_back(static_cast<std::uint8_t>(found - quality.flag_meanings.begin()));
    }
    quality.stretch = session.names.stretch;
    store::add_quality(record_nc, quality);
    const campaign::Campaign& c = session.campaign;
    store::set_discovery(record_nc, {c.name, c.summary, c.creator, c.institution, c.licence,
                                     c.keywords, "", "", now, RILLSTRAND_VERSION});
}

} // namespace

void tell_warnings(const Warnings& warnings, std::ostream& log) {
    for (const auto& warning : warnings)
        log << "warning: " << warning.text << '\n';
}

void gather_stage(Session& session, const Output& output, const Context& context) {
    const std::filesystem::path record_nc = output.staging() / "record.nc";
    session.gathered = store::gather(session.campaign, record_nc,
                                     context.now + " gathered by rillstrand " RILLSTRAND_VERSION,
                                     context.progress);
    if (!std::filesystem::exists(record_nc)) // somebody removed the folder meanwhile
        throw MachineError{record_nc.string() +
                           ": vanished while the record was gathered; run again"};
    session.source = store::open_canonical(record_nc);
    session.record_axes = session.source->axes();
    session.warnings = session.gathered.warnings;
    name_channels(session);
    const record::Axes& axes = session.axes();
    double spacing_m = 0.5;
    if (axes.n_place() > 1)
        spacing_m = (axes.distance_m(axes.n_place() - 1) - axes.distance_m(0)) /
                    static_cast<double>(axes.n_place() - 1);
    session.spatial_response_m = std::max(1.0, 2.0 * spacing_m);
    adjust_stage(session, output, context);
}

void assess_stage(Session& session, const Context& context) {
    session.scan = record::scan(*session.source, {}, context.progress);
    flag_channels(session);
    events_stage(session, context);
    for (const auto& [flag, words] :
         {std::pair{"dead", "hold no sample at all"},
          std::pair{"sparse", "miss over half of their samples"},
          std::pair{"noisy", "are over five times as noisy as the others"}}) {
        const Eigen::Index count = count_flag(session, flag);
        if (count > 0)
            session.warnings.push_back(
                {std::string{"channels-"} + flag, std::to_string(count) + " channels " + words});
    }
    for (const auto& bath : session.campaign.baths) {
        session.baths.push_back(quality::assess_bath(
            *session.source, bath, bath_reference(session, bath), session.spatial_response_m));
        const auto& result = session.baths.back();
        if (!result.stirred)
            session.warnings.push_back(
                {"bath-not-stirred", "bath '" + bath.name + "' has a gradient of " +
                                         text::fixed(result.gradient_km, 4) +
                                         " K/m inside; stir it, or correct its from_m and to_m"});
        if (std::abs(result.bias_c) > 0.2 && std::abs(result.bias_c) > 3.0 * result.bias_sd_c)
            session.warnings.push_back({"bath-bias", "the record reads " +
                                                         text::fixed(result.bias_c, 2) +
                                                         " K off in bath '" + bath.name + "'"});
    }
}

void place_stage(Session& session, const Context& context) {
    if (!session.campaign.placement)
        return;
    context.progress.stage("placing channels", static_cast<double>(session.axes().n_place()),
                           "channels");
    session.placement =
        geo::place(session.campaign, session.axes().distance_m, session.source.get());
    for (const auto& warning : session.placement->warnings)
        session.warnings.push_back(warning);
    const geo::ChannelPositions& c = session.placement->channels;
    if (session.campaign.placement->turnaround_m)
        session.legs = quality::compare_legs(session.axes().distance_m, c.ground_m,
                                             session.scan->mean_degC, c.leg);
    const auto& reasons = c.reason;
    for (std::size_t j = 0; j < reasons.size(); ++j)
        if (reasons[j] != geo::NoPosition::placed && session.names.flag[j] == "ok")
            session.names.flag[j] = "no_position";
}

void stream_stage(Session& session, const Context& context) {
    for (const auto& config : session.campaign.streams) {
        const stream::StreamInput input = stream_input(session, config, context);
        context.progress.stage("finding inflows of '" + config.stretch + "'",
                               static_cast<double>(input.fibre_m.size()), "channels");
        session.streams.push_back(stream::interpret(input));
        session.streams.back().stretch = config.stretch;
    }
}

void run_all(const std::filesystem::path& campaign_file, const Context& context) {
    context.progress.stage("checking the campaign", 0.0, "");
    Session session;
    session.campaign = checked_campaign(campaign_file);
    Output output{session.campaign.output};
    gather_stage(session, output, context);
    assess_stage(session, context);
    place_stage(session, context);
    stream_stage(session, context);
    snow_stage(session, context);
    column_stage(session, context);
    bed_stage(session, context);

    context.progress.stage("writing results", 0.0, "");
    const Tables tables = make_tables(session);
    const Json findings = findings_json(session, tables, context.now);
    for (const auto& table : tables.all)
        output.write("tables/" + table.name() + ".csv", to_csv(table));
    write_all_layers(session, tables, findings, output, context.now);
    output.write("findings.json", json_text(findings));
    output.write("report.html", page_of(session, tables, findings));
    session.source.reset();
    describe_record(session, output.staging() / "record.nc", context.now);
    const auto files = output.commit();
    tell_warnings(session.warnings, context.log);
    tell_findings(session, context.out);
    context.out << files.size() << " files in " << output.folder().string() << '\n';
}

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#include "layer_tables.hpp"

#include "adjust_stage.hpp"
#include "bed_tables.hpp"
#include "column_stage.hpp"
#include "corridor.hpp"
#include "layers.hpp"
#include "quality_events.hpp"
#include "snow_tables.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <set>

namespace rillstrand::app {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
using Reals = std::vector<double>;

Reals reals(const Eigen::ArrayXd& values) {
    return {values.data(), values.data() + values.size()};
}

/// A position for a fibre distance, between the two nearest placed channels.
class Positions {
public:
    explicit Positions(const Session& session) : m_session{session} {}

    bool any() const { return m_session.placement.has_value(); }

    double at(const Eigen::ArrayXd& values, double fibre_m) const {
        const Eigen::ArrayXd& d = m_session.axes().distance_m;
        const double* begin = d.data();
        const auto k = std::lower_bound(begin, begin + d.size(), fibre_m) - begin;
        if (k == 0)
            return values(0);
        if (k == d.size())
            return values(d.size() - 1);
        const double w = (fibre_m - d(k - 1)) / (d(k) - d(k - 1));
        if (std::isnan(values(k - 1)) || std::isnan(values(k)))
            return w < 0.5 ? values(k - 1) : values(k);
        return (1.0 - w) * values(k - 1) + w * values(k);
    }

    /// Appends x, y, z, lon, lat, position_sd_m and station_m for fibre distances.
    /// @param own_sd_m  sd of the fibre distances themselves; may be empty
    void append(Table& table, const Reals& fibre_m, const Reals& own_sd_m = {}) const {
        if (!any())
            return;
        const geo::ChannelPositions& c = m_session.placement->channels;
        const auto column = [&](const Eigen::ArrayXd& values) {
            Reals result;
            for (const double f : fibre_m)
                result.push_back(at(values, f));
            return result;
        };
        Reals sd = column(c.position_sd_m);
        for (std::size_t i = 0; i < own_sd_m.size(); ++i)
            if (std::isfinite(own_sd_m[i]))
                sd[i] = std::hypot(sd[i], own_sd_m[i]);
        const int decimals = degrees() ? 8 : 3;
        table.add_real("position_sd_m", "horizontal position error, root mean square", "m", sd, 2);
        if (c.station_m.isFinite().any())
            table.add_real("station_m", "chainage along the river", "m", column(c.station_m), 2);
        table.add_real("x", "easting or longitude", "", column(c.x), decimals);
        table.add_real("y", "northing or latitude", "", column(c.y), decimals);
        if (c.z.isFinite().any())
            table.add_real("z", "elevation", "m", column(c.z), 2);
        table.add_real("lon", "longitude, WGS 84", "degrees_east", column(c.lon), 8);
        table.add_real("lat", "latitude, WGS 84", "degrees_north", column(c.lat), 8);
    }

private:
    bool degrees() const {
        const auto& y = m_session.placement->channels.y;
        const auto& lat = m_session.placement->channels.lat;
        for (Eigen::Index j = 0; j < y.size(); ++j)
            if (std::isfinite(y(j)))
                return std::abs(y(j) - lat(j)) < 0.1;
        return false;
    }
    const Session& m_session;
};

Table channels_table(const Session& session, const Positions& positions) {
    const record::ScanSummary& s = *session.scan;
    Table table{"channels", "Every channel of the cable with the statistics of its record"};
    const Reals fibre_m = reals(session.axes().distance_m);
    table.add_real("fibre_m", "fibre distance from the instrument", "m", fibre_m, 3);
    table.add_text("stretch", "stretch", session.names.stretch);
    table.add_text("setting", "setting of the stretch", session.names.setting);
    table.add_real("mean_c", "mean temperature", "degC", reals(s.mean_degC), 4);
    table.add_real("sd_c", "standard deviation in time", "K", reals(s.sd_degC), 4);
    table.add_real("min_c", "lowest temperature", "degC", reals(s.min_degC), 3);
    table.add_real("max_c", "highest temperature", "degC", reals(s.max_degC), 3);
    table.add_real("p05_c", "5 % quantile", "degC", reals(s.p05_degC), 3);
    table.add_real("p50_c", "median", "degC", reals(s.p50_degC), 3);
    table.add_real("p95_c", "95 % quantile", "degC", reals(s.p95_degC), 3);
    table.add_real("daily_range_c", "mean of the days' maximum minus minimum", "K",
                   reals(s.daily_range_K), 3);
    table.add_real("diurnal_amplitude_c", "amplitude of the 24 h wave", "K",
                   reals(s.diurnal_amplitude_K), 4);
    table.add_real("diurnal_phase_h", "hour of the 24 h wave's peak, UTC", "h",
                   reals(s.diurnal_phase_h), 3);
    table.add_real("noise_c", "white noise of one sample", "K", reals(s.noise_K), 4);
    if (session.adjustment)
        table.add_real("adjust_sd_c", "what the baths leave open, the same error at all times", "K",
                       reals(session.adjustment->channel_sd_K), 4);
    table.add_text("flag", "what is wrong with the channel", session.names.flag);
    positions.append(table, fibre_m);
    if (!session.placement)
        return table;
    const geo::ChannelPositions& c = session.placement->channels;
    table.add_real("along_sd_m", "position error along the line", "m", reals(c.along_sd_m), 2);
    table.add_real("across_sd_m", "position error across the line", "m", reals(c.across_sd_m), 2);
    if (session.campaign.placement->turnaround_m)
        table.add_integer("leg", "leg of the loop", {c.leg.begin(), c.leg.end()});
    if (c.station_m.isFinite().any())
        table.add_real("offset_m", "distance from the river, positive to the right", "m",
                       reals(c.offset_m), 2);
    if (c.slope_deg.size() > 0) {
        table.add_real("slope_deg", "slope of the elevation", "degree", reals(c.slope_deg), 2);
        table.add_real("aspect_deg", "aspect of the elevation, from north", "degree",
                       reals(c.aspect_deg), 1);
    }
    for (const auto& raster : c.rasters)
        table.add_real(text::slug(raster.name), raster.name, "", reals(raster.values), 4);
    return table;
}

Table ties_table(const Session& session) {
    Table table{"tie_points", "Surveyed tie points and how they fit"};
    Reals fibre, sd, residual, slack, x, y, z, lon, lat, offset;
    std::vector<std::string> label, reason;
    std::vector<bool> used;
    for (const auto& tie : session.placement->ties) {
        fibre.push_back(tie.fibre_m);
        label.push_back(tie.label);
        sd.push_back(tie.sd_m);
        residual.push_back(tie.residual_m);
        slack.push_back(tie.slack);
        used.push_back(tie.used);
        reason.push_back(tie.reason);
        offset.push_back(tie.offset_m);
        x.push_back(tie.x);
        y.push_back(tie.y);
        z.push_back(tie.z);
        lon.push_back(tie.lon);
        lat.push_back(tie.lat);
    }
    table.add_real("fibre_m", "fibre distance from the instrument", "m", fibre, 3);
    table.add_text("label", "label", label);
    table.add_real("sd_m", "standard deviation of each surveyed coordinate", "m", sd, 3);
    table.add_real("residual_m", "surveyed minus expected from the others", "m", residual, 2);
    table.add_real("slack", "fibre metres per ground metre to the next one", "1", slack, 4);
    table.add_boolean("used", "used in the adjustment", used);
    table.add_text("reason", "why it was set aside", reason);
    if (session.placement->has_route)
        table.add_real("offset_m", "distance from the route, positive to the right", "m", offset,
                       2);
    const bool degrees = !x.empty() && std::abs(y.front() - lat.front()) < 0.1;
    table.add_real("x", "easting or longitude", "", x, degrees ? 8 : 3);
    table.add_real("y", "northing or latitude", "", y, degrees ? 8 : 3);
    table.add_real("z", "elevation", "m", z, 2);
    table.add_real("lon", "longitude, WGS 84", "degrees_east", lon, 8);
    table.add_real("lat", "latitude, WGS 84", "degrees_north", lat, 8);
    return table;
}

Table cable_table(const Session& session) {
    Table table{"cable", "The cable on the ground, a line a stretch"};
    std::vector<std::string> stretch;
    Reals from, to, slack, fibre;
    for (const auto& line : session.placement->cable) {
        stretch.push_back(line.stretch);
        from.push_back(line.from_m);
        to.push_back(line.to_m);
        slack.push_back(line.slack);
        fibre.push_back(0.5 * (line.from_m + line.to_m));
    }
    table.add_text("stretch", "stretch", stretch);
    table.add_real("fibre_m", "middle of the stretch on the fibre", "m", fibre, 3);
    table.add_real("from_m", "fibre distance where it begins", "m", from, 3);
    table.add_real("to_m", "fibre distance where it ends", "m", to, 3);
    table.add_real("slack", "fibre metres per ground metre", "1", slack, 4);
    return table;
}

Table inflows_table(const Session& session, const Positions& positions) {
    Table table{"inflows", "Water that comes in, each with its uncertainty"};
    std::vector<std::string> stretch, kind, label, evidence;
    std::vector<bool> known;
    Reals fibre, fibre_sd, from, to, fraction, fraction_sd, t, t_sd, q, q_sd, contrast, score,
        anomaly, priority;
    for (const auto& reach : session.streams)
        for (const auto& in : reach.inflows) {
            stretch.push_back(reach.stretch);
            kind.push_back(stream::to_string(in.kind));
            known.push_back(in.known);
            label.push_back(in.label);
            fibre.push_back(in.fibre_m);
            fibre_sd.push_back(in.fibre_sd_m);
            from.push_back(in.fibre_from_m);
            to.push_back(in.fibre_to_m);
            fraction.push_back(in.fraction);
            fraction_sd.push_back(in.fraction_sd);
            t.push_back(in.temperature_c);
            t_sd.push_back(in.temperature_sd_c);
            q.push_back(in.discharge_m3s);
            q_sd.push_back(in.discharge_sd_m3s);
            contrast.push_back(in.contrast_c);
            score.push_back(in.score);
            anomaly.push_back(in.anomaly_c);
            priority.push_back(in.priority);
            std::string words;
            for (const auto& sentence : in.evidence)
                words += (words.empty() ? "" : " ") + sentence;
            evidence.push_back(words);
        }
    table.add_real("fibre_m", "fibre distance from the instrument", "m", fibre, 2);
    table.add_real("fibre_sd_m", "its standard deviation", "m", fibre_sd, 2);
    table.add_text("stretch", "stretch", stretch);
    table.add_text("kind", "step, spot or diffuse", kind);
    table.add_boolean("known", "declared as surface water", known);
    table.add_text("label", "label of the declared water", label);
    table.add_real("fibre_from_m", "where it begins on the fibre", "m", from, 2);
    table.add_real("fibre_to_m", "where it ends on the fibre", "m", to, 2);
    table.add_real("fraction", "share of the discharge just below", "1", fraction, 5);
    table.add_real("fraction_sd", "its standard deviation", "1", fraction_sd, 5);
    table.add_real("temperature_c", "temperature of the inflow", "degC", t, 3);
    table.add_real("temperature_sd_c", "its standard deviation", "K", t_sd, 3);
    table.add_real("discharge_m3s", "discharge of the inflow", "m3 s-1", q, 6);
    table.add_real("discharge_sd_m3s", "its standard deviation", "m3 s-1", q_sd, 6);
    table.add_real("contrast_c", "inflow minus stream, mean of its size", "K", contrast, 3);
    table.add_real("score", "standard deviations from nothing", "1", score, 2);
    table.add_real("anomaly_c", "mean step at the cable", "K", anomaly, 4);
    table.add_real("priority", "how much it is worth a visit, 0 to 1", "1", priority, 2);
    table.add_text("evidence", "what it rests on", evidence);
    positions.append(table, fibre, fibre_sd);
    return table;
}

/// A column for each threshold that any stream's regime asks for; NaN for streams that do not.
void add_hours_above(Table& table, const Session& session) {
    std::set<double> thresholds;
    for (const auto& config : session.campaign.streams)
        thresholds.insert(config.regime.hours_above_c.begin(), config.regime.hours_above_c.end());
    for (const double threshold : thresholds) {
        Reals hours;
        for (std::size_t r = 0; r < session.streams.size(); ++r) {
            const auto& own = session.campaign.streams[r].regime.hours_above_c;
            const auto& channels = session.streams[r].channels;
            const auto found = std::find(own.begin(), own.end(), threshold);
            const auto which = static_cast<std::size_t>(found - own.begin());
            for (Eigen::Index j = 0; j < channels.fibre_m.size(); ++j)
                hours.push_back(found == own.end() ? nan : channels.hours_above[which](j));
        }
        table.add_real("hours_above_" + text::slug(text::number(threshold)) + "_c",
                       "hours above " + text::number(threshold) + " degC", "h", hours, 2);
    }
}

Table stream_channels_table(const Session& session, const Positions& positions) {
    Table table{"stream_channels", "Channels of the streams: background, anomaly, detection limit"};
    std::vector<std::string> stretch;
    Reals fibre, background, anomaly, limit, sevendadm, q, q_sd;
    std::vector<std::pair<double, Reals>> above;
    for (const auto& reach : session.streams) {
        const stream::StreamChannels& c = reach.channels;
        for (Eigen::Index j = 0; j < c.fibre_m.size(); ++j) {
            stretch.push_back(reach.stretch);
            fibre.push_back(c.fibre_m(j));
            background.push_back(c.background_c(j));
            anomaly.push_back(c.anomaly_c(j));
            limit.push_back(c.detection_limit_fraction(j));
            sevendadm.push_back(c.sevendadm_c(j));
            q.push_back(c.discharge_m3s.size() > 0 ? c.discharge_m3s(j) : nan);
            q_sd.push_back(c.discharge_sd_m3s.size() > 0 ? c.discharge_sd_m3s(j) : nan);
        }
    }
    table.add_real("fibre_m", "fibre distance from the instrument", "m", fibre, 3);
    table.add_text("stretch", "stretch", stretch);
    table.add_real("background_c", "mean temperature that the stream would have here", "degC",
                   background, 4);
    table.add_real("anomaly_c", "mean temperature minus background", "K", anomaly, 4);
    table.add_real("detection_limit_fraction", "smallest share found with 95 % power", "1", limit,
                   5);
    table.add_real("sevendadm_c", "greatest seven-day mean of daily maxima", "degC", sevendadm, 3);
    table.add_real("discharge_m3s", "discharge of the stream", "m3 s-1", q, 6);
    table.add_real("discharge_sd_m3s", "its standard deviation", "m3 s-1", q_sd, 6);
    add_hours_above(table, session);
    positions.append(table, fibre);
    return table;
}

Table baths_table(const Session& session) {
    Table table{"baths", "Reference baths against the record"};
    std::vector<std::string> name, use;
    Reals from, to, bias, bias_sd, rmse, drift, drift_sd, gradient, gradient_sd;
    for (const auto& b : session.baths) {
        name.push_back(b.name);
        use.emplace_back(b.use == campaign::BathUse::adjust ? "adjust" : "validate");
        from.push_back(b.from_m);
        to.push_back(b.to_m);
        bias.push_back(b.bias_c);
        bias_sd.push_back(b.bias_sd_c);
        rmse.push_back(b.rmse_c);
        drift.push_back(b.drift_kd);
        drift_sd.push_back(b.drift_sd_kd);
        gradient.push_back(b.gradient_km);
        gradient_sd.push_back(b.gradient_sd_km);
    }
    table.add_text("name", "bath", name);
    table.add_text("use", "adjust or validate", use);
    table.add_real("from_m", "first channel used", "m", from, 3);
    table.add_real("to_m", "last channel used", "m", to, 3);
    table.add_real("bias_c", "record minus reference, mean", "K", bias, 4);
    table.add_real("bias_sd_c", "its standard deviation", "K", bias_sd, 4);
    table.add_real("rmse_c", "record minus reference, root mean square", "K", rmse, 4);
    table.add_real("drift_kd", "drift of the difference", "K d-1", drift, 4);
    table.add_real("drift_sd_kd", "its standard deviation", "K d-1", drift_sd, 4);
    table.add_real("gradient_km", "gradient inside the bath", "K m-1", gradient, 5);
    table.add_real("gradient_sd_km", "its standard deviation", "K m-1", gradient_sd, 5);
    return table;
}

geo::Layer as_layer(const Table& table, const Session& session) {
    const Column* x = table.find("x");
    if (table.name() == "cable") {
        geo::Layer layer{table, geo::GeometryKind::line_string_z, {}, {}};
        for (const auto& line : session.placement->cable)
            layer.vertices.push_back(line.vertices);
        return layer;
    }
    if (x == nullptr)
        return geo::table_layer(table);
    const Column* z = table.find("z");
    const bool has_z = table.name() == "channels" || table.name() == "tie_points" ||
                       table.name().ends_with("_profiles");
    geo::Layer layer =
        geo::point_layer(table, has_z ? geo::GeometryKind::point_z : geo::GeometryKind::point,
                         x->real, table.find("y")->real, has_z && z != nullptr ? z->real : Reals{});
    if (table.name() == "inflows")
        layer.look.waypoints = true;
    return layer;
}

std::string share_text(const stream::Inflow& in) {
    if (!std::isfinite(in.fraction))
        return in.kind == stream::Kind::spot ? "spot, no measurable share"
                                             : "share not resolvable here";
    return text::fixed(100.0 * in.fraction, 2) + " ± " + text::fixed(100.0 * in.fraction_sd, 2) +
           " % of the flow";
}

} // namespace

const Table* Tables::find(const std::string& name) const {
    for (const auto& table : all)
        if (table.name() == name)
            return &table;
    return nullptr;
}

Tables make_tables(const Session& session) {
    const Positions positions{session};
    Tables tables;
    tables.all.push_back(channels_table(session, positions));
    if (session.placement) {
        tables.all.push_back(cable_table(session));
        tables.all.push_back(ties_table(session));
    }
    if (!session.streams.empty()) {
        tables.all.push_back(inflows_table(session, positions));
        tables.all.push_back(stream_channels_table(session, positions));
    }
    if (!session.snows.empty()) {
        Table channels = snow_channels_table(session);
        positions.append(channels, channels.find("fibre_m")->real);
        tables.all.push_back(std::move(channels));
        tables.all.push_back(snow_daily_table(session));
        tables.all.push_back(snow_cover_table(session));
        if (Table classes = snow_classes_table(session); classes.rows() > 0)
            tables.all.push_back(std::move(classes));
    }
    add_column_tables(session, tables);
    for (Table& table : bed_tables(session))
        tables.all.push_back(std::move(table));
    if (!session.baths.empty())
        tables.all.push_back(baths_table(session));
    if (!session.events.empty())
        tables.all.push_back(events_table(session));
    return tables;
}

void write_all_layers(const Session& session, const Tables& tables, const Json& findings,
                      const Output& output, const std::string& now) {
    if (!session.placement)
        return; // no positions, no layers with geometry
    const campaign::Campaign& c = session.campaign;
    geo::LayerSet set;
    set.crs = session.placement->output_crs;
    set.title = c.name;
    set.summary = c.summary;
    set.creator = c.creator;
    set.institution = c.institution;
    set.licence = c.licence;
    set.keywords = c.keywords;
    set.provenance = findings.at("provenance").dump();
    set.now = now;
    for (const auto& table : tables.all)
        set.layers.push_back(as_layer(table, session));
    if (!session.snows.empty()) {
        geo::Look look;
        look.colour_by = "probability";
        look.time_by = "date";
        set.views.push_back(
            {"snow_daily_map", "Snow day by day", "snow_daily", "snow_channels", "fibre_m", look});
    }
    geo::write_layers(set, c.layers.formats, output.staging());
    if (!c.layers.corridor_m)
        return;
    const geo::ChannelPositions& p = session.placement->channels;
    geo::Corridor corridor;
    corridor.title = "Mean temperature";
    corridor.unit = "degC";
    corridor.crs = set.crs;
    corridor.x = reals(p.x);
    corridor.y = reals(p.y);
    corridor.value = reals(session.scan->mean_degC);
    corridor.corridor_m = *c.layers.corridor_m;
    corridor.now = now;
    geo::write_corridor(corridor, output.staging() / "layers" / "mean_temperature.tif");
    for (const SnowRaster& raster : snow_rasters(session)) {
        corridor.title = raster.title;
        corridor.unit = raster.unit;
        corridor.value = raster.value;
        geo::write_corridor(corridor, output.staging() / "layers" / raster.file);
    }
}

void tell_findings(const Session& session, std::ostream& out) {
    const record::Axes& axes = session.axes();
    out << session.campaign.name << ": " << axes.n_place() << " channels, " << axes.n_time()
        << " traces from " << text::iso_time(axes.time_s(0)) << " to "
        << text::iso_time(axes.time_s(axes.n_time() - 1)) << '\n';
    tell_adjustment(session, out);
    for (const auto& bath : session.baths)
        out << "bath '" << bath.name << "': bias " << text::fixed(bath.bias_c, 3) << " ± "
            << text::fixed(bath.bias_sd_c, 3) << " K, rmse " << text::fixed(bath.rmse_c, 3)
            << " K\n";
    if (session.placement) {
        const auto& sd = session.placement->channels.position_sd_m;
        Reals placed;
        for (const double value : sd)
            if (std::isfinite(value))
                placed.push_back(value);
        std::sort(placed.begin(), placed.end());
        out << "placed " << placed.size() << " of " << axes.n_place() << " channels";
        if (!placed.empty())
            out << ", position sd " << text::fixed(placed[placed.size() / 2], 1) << " m (median)";
        out << ", slack " << text::fixed(session.placement->slack_mean, 3) << '\n';
    }
    tell_snow(session, out);
    tell_columns(session, out);
    tell_beds(session, out);
    for (const auto& reach : session.streams) {
        out << "stream '" << reach.stretch << "': " << reach.inflows.size() << " found";
        if (std::isfinite(reach.detection_limit_median))
            out << "; the smallest share that would have been seen is "
                << text::fixed(100.0 * reach.detection_limit_median, 2) << " % (median)";
        else
            out << "; inflows are not resolvable here";
        out << '\n';
        for (const auto& in : reach.inflows) {
            out << "  " << text::fixed(in.fibre_m, 1) << " ± " << text::fixed(in.fibre_sd_m, 1)
                << " m  " << stream::to_string(in.kind) << (in.known ? " (" + in.label + ")" : "")
                << ": " << share_text(in);
            if (std::isfinite(in.temperature_c))
                out << " at " << text::fixed(in.temperature_c, 1) << " ± "
                    << text::fixed(in.temperature_sd_c, 1) << " degC";
            if (std::isfinite(in.discharge_m3s))
                out << ", " << text::fixed(1000.0 * in.discharge_m3s, 2) << " ± "
                    << text::fixed(1000.0 * in.discharge_sd_m3s, 2) << " L/s";
            out << '\n';
        }
    }
}

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#include "campaign/read_parts.hpp"

#include "base/text.hpp"

namespace rillstrand::campaign {

namespace {

constexpr Range water_temperature{-2.0, 100.0, false};

void read_gauging(TableReader& in, Stream& stream) {
    Gauging out;
    out.where = in.where();
    in.require("fibre_m", "where on the fibre the discharge was measured");
    in.require("discharge_m3s", "the discharge");
    in.real("fibre_m", out.fibre_m);
    in.real("discharge_m3s", out.discharge_m3s, positive);
    out.sd_said = in.real("discharge_sd_m3s", out.discharge_sd_m3s, not_negative);
    if (!out.sd_said) {
        out.discharge_sd_m3s = 0.05 * out.discharge_m3s;
        in.used_default("discharge_sd_m3s", "5 % of discharge_m3s");
    }
    stream.gauging.push_back(out);
}

void read_weather(TableReader& in, Stream& stream) {
    Weather out;
    out.where = in.where();
    in.require("file", "the file of the weather");
    in.path("file", out.file);
    in.text("air_temperature", out.air_temperature);
    in.text("relative_humidity", out.relative_humidity);
    in.text("wind_speed", out.wind_speed);
    in.text("shortwave", out.shortwave);
    if (!out.air_temperature && !out.relative_humidity && !out.wind_speed && !out.shortwave)
        in.problem("file", "no column of it is named; name at least one of air_temperature, "
                           "relative_humidity, wind_speed, shortwave");
    stream.weather = out;
}

void read_known(TableReader& in, Stream& stream) {
    KnownInflow out;
    out.where = in.where();
    in.require("fibre_m", "where on the fibre it joins");
    in.text("label", out.label);
    in.real("fibre_m", out.fibre_m);
    in.table("temperature", [&out](TableReader& inner) {
        inner.exclusive({"stretch", "file"});
        if (inner.text("stretch", out.temperature_stretch))
            return;
        SideSeries series;
        series.where = inner.where();
        inner.require("file", "the file of the series, or stretch");
        inner.require("column", "the name of the column");
        const bool file = inner.path("file", series.file);
        const bool column = inner.text("column", series.column);
        if (file && column)
            out.temperature = series;
    });
    stream.known.push_back(out);
}

void read_discharge(TableReader& in, Stream& out) {
    in.word("discharge_at", out.discharge_at,
            {{"upstream", DischargeAt::upstream}, {"downstream", DischargeAt::downstream}});
    in.exclusive({"discharge_m3s", "discharge"});
    in.real("discharge_m3s", out.discharge_m3s, positive);
    in.series("discharge", out.discharge);
    in.real("discharge_sd_m3s", out.discharge_sd_m3s, not_negative);
    if (out.discharge_sd_m3s && !in.has("discharge_m3s") && !in.has("discharge"))
        in.problem("discharge_sd_m3s", "stands without discharge_m3s; give the discharge too");
    if (out.discharge_m3s || out.discharge) {
        in.used_default("discharge_at", "upstream");
        if (!out.discharge_sd_m3s)
            in.used_default("discharge_sd_m3s", "5 % of the discharge");
    }
}

} // namespace

void read_streams(TableReader& root, Campaign& campaign) {
    root.tables("stream", [&campaign](TableReader& in) {
        Stream out;
        out.where = in.where();
        in.require("stretch", "the stretch that lies in the stream");
        in.text("stretch", out.stretch);
        in.word("flow", out.flow,
                {{"increasing", Flow::increasing}, {"decreasing", Flow::decreasing}});
        in.used_default("flow", "increasing");
        in.exclusive({"inflow_temperature_c", "inflow_temperature"});
        in.real("inflow_temperature_c", out.inflow_temperature_c, water_temperature);
        in.series("inflow_temperature", out.inflow_temperature);
        in.real("inflow_temperature_sd_c", out.inflow_temperature_sd_c, not_negative);
        if (out.inflow_temperature_sd_c && !in.has("inflow_temperature_c") &&
            !in.has("inflow_temperature"))
            in.problem("inflow_temperature_sd_c",
                       "stands without inflow_temperature_c; give the temperature too");
        if ((out.inflow_temperature_c || out.inflow_temperature) && !out.inflow_temperature_sd_c) {
            out.inflow_temperature_sd_c = 0.3;
            in.used_default("inflow_temperature_sd_c", "0.3");
        }
        read_discharge(in, out);
        in.tables("gauging", [&out](TableReader& inner) { read_gauging(inner, out); });
        in.table("weather", [&out](TableReader& inner) { read_weather(inner, out); });
        in.table("regime", [&out](TableReader& inner) {
            inner.reals("hours_above_c", out.regime.hours_above_c);
            inner.real("refuge_colder_by_c", out.regime.refuge_colder_by_c, positive);
        });
        in.tables("known", [&out](TableReader& inner) { read_known(inner, out); });
        campaign.streams.push_back(out);
    });
}

void read_snows(TableReader& root, Campaign& campaign) {
    root.tables("snow", [&campaign](TableReader& in) {
        Snow out;
        out.where = in.where();
        in.require("stretch", "the stretch that lies on the ground");
        in.text("stretch", out.stretch);
        in.real("utc_offset_h", out.utc_offset_h, {-14.0, 14.0, false});
        in.series("air", out.air);
        in.word("method", out.method,
                {{"model", SnowMethod::model}, {"threshold", SnowMethod::threshold}});
        in.used_default("method", "model");
        in.real("swing_below_c", out.swing_below_c, positive);
        in.real("mean_below_c", out.mean_below_c);
        in.real("minimum_days", out.minimum_days, {1.0, 366.0, false});
        if (out.method == SnowMethod::threshold)
            for (const char* key : {"swing_below_c", "mean_below_c", "minimum_days"})
                in.require(key, "the number: with method = \"threshold\" all three are yours");
        campaign.snows.push_back(out);
    });
}

namespace {

void read_winding(TableReader& in, std::optional<Winding>& winding) {
    Winding out;
    in.require("diameter_m", "the diameter to the fibre's centre line");
    in.require("pitch_m", "the height of one turn");
    const bool diameter = in.real("diameter_m", out.diameter_m, {0.0, 100.0, true});
    const bool pitch = in.real("pitch_m", out.pitch_m, {0.0, 100.0, true});
    if (diameter && pitch)
        winding = out;
}

void read_position(TableReader& in, std::optional<std::array<double, 2>>& position) {
    std::vector<double> xy;
    if (!in.reals("position", xy))
        return;
    if (xy.size() == 2)
        position = {xy[0], xy[1]};
    else
        in.problem("position", "is not two numbers; write [x, y]");
}

} // namespace

void read_columns(TableReader& root, Campaign& campaign) {
    root.tables("column", [&campaign](TableReader& in) {
        Column out;
        out.where = in.where();
        for (const char* key : {"name", "stretch", "datum_fibre_m"})
            in.require(key, "it");
        in.text("name", out.name);
        in.text("stretch", out.stretch);
        in.real("datum_fibre_m", out.datum_fibre_m);
        in.real("datum_elevation_m", out.datum_elevation_m);
        in.word("direction", out.direction, {{"down", Direction::down}, {"up", Direction::up}});
        in.used_default("direction", "down");
        in.table("winding", [&out](TableReader& inner) { read_winding(inner, out.winding); });
        read_position(in, out.position);
        in.exclusive({"level_m", "water_level_m", "water_level"});
        in.real("level_m", out.water_level_m);
        in.real("water_level_m", out.water_level_m);
        in.series("water_level", out.water_level);
        if ((out.water_level_m || out.water_level) && !out.datum_elevation_m)
            in.require("datum_elevation_m", "the elevation of the datum, since a level is given");
        in.path("hypsograph", out.hypsograph);
        in.series("wind", out.wind);
        in.real("wind_height_m", out.wind_height_m, {0.5, 100.0, false});
        if (out.wind)
            in.used_default("wind_height_m", "10");
        in.real("salinity_gkg", out.salinity_gkg, {0.0, 42.0, false});
        in.used_default("salinity_gkg", "0");
        campaign.columns.push_back(out);
    });
}

void read_beds(TableReader& root, Campaign& campaign) {
    root.tables("bed", [&campaign](TableReader& in) {
        Bed out;
        out.where = in.where();
        for (const char* key : {"name", "stretch", "datum_fibre_m"})
            in.require(key, "it");
        in.text("name", out.name);
        in.text("stretch", out.stretch);
        in.real("datum_fibre_m", out.datum_fibre_m);
        in.word("direction", out.direction, {{"down", Direction::down}, {"up", Direction::up}});
        in.used_default("direction", "down");
        in.table("winding", [&out](TableReader& inner) { read_winding(inner, out.winding); });
        read_position(in, out.position);
        in.real("datum_elevation_m", out.datum_elevation_m);
        in.real("thermal_conductivity_wmk", out.thermal_conductivity_wmk, {0.0, 20.0, true});
        in.used_default("thermal_conductivity_wmk", text::number(out.thermal_conductivity_wmk));
        in.real("heat_capacity_jm3k", out.heat_capacity_jm3k, {1e5, 1e7, false});
        in.used_default("heat_capacity_jm3k", text::number(out.heat_capacity_jm3k));
        in.real("porosity", out.porosity, {0.0, 1.0, false});
        in.used_default("porosity", text::number(out.porosity));
        campaign.beds.push_back(out);
    });
}

} // namespace rillstrand::campaign

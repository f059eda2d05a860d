// SPDX-License-Identifier: Apache-2.0
#include "campaign/read_parts.hpp"

#include "base/text.hpp"

namespace rillstrand::campaign {

namespace {

void read_record_text(TableReader& in, RecordText& out) {
    in.character("delimiter", out.delimiter);
    if (in.character("decimal", out.decimal) && *out.decimal != '.' && *out.decimal != ',')
        in.problem("decimal", "is neither a point nor a comma; write \".\" or \",\"");
    if (out.decimal && out.delimiter && *out.decimal == *out.delimiter)
        in.problem("decimal", "is the delimiter too; they must differ");
    in.text("comment", out.comment);
    in.used_default("comment", out.comment);
    in.integer("skip_lines", out.skip_lines, 0, 1000000);
    in.text("time_column", out.time_column);
    in.used_default("time_column", out.time_column);
    in.text("distance_column", out.distance_column);
    in.used_default("distance_column", out.distance_column);
    in.text("temperature_column", out.temperature_column);
    in.used_default("temperature_column", out.temperature_column);
    in.text("time_format", out.time_format);
    in.text("time_from_name", out.time_from_name);
    in.text("time_from_header", out.time_from_header);
    in.exclusive({"time_from_name", "time_from_header"});
    in.text("stokes_column", out.stokes_column);
    in.text("antistokes_column", out.antistokes_column);
    in.text("reverse_stokes_column", out.reverse_stokes_column);
    in.text("reverse_antistokes_column", out.reverse_antistokes_column);
}

void read_record_grid(TableReader& in, RecordGrid& out) {
    in.text("variable", out.variable);
    in.used_default("variable", out.variable);
    in.text("stokes", out.stokes);
    in.text("antistokes", out.antistokes);
    in.text("reverse_stokes", out.reverse_stokes);
    in.text("reverse_antistokes", out.reverse_antistokes);
}

void read_valid_range(TableReader& in, Record& out) {
    std::vector<double> range;
    if (!in.reals("valid_range_c", range)) {
        in.used_default("valid_range_c", "[-80, 120]");
        return;
    }
    if (range.size() != 2 || !(range[0] < range[1]))
        in.problem("valid_range_c", "is not a lower and a higher number; write [low, high]");
    else
        out.valid_range_c = {range[0], range[1]};
}

} // namespace

void read_record(TableReader& root, Campaign& campaign) {
    root.require("record", "[record] with the files of the record");
    root.table("record", [&campaign](TableReader& in) {
        Record& out = campaign.record;
        out.where = in.where();
        in.require("files", "the record's files, e.g. files = [\"traces/*.csv\"]");
        if (in.texts("files", out.files) && out.files.empty())
            in.problem("files", "names no file; give at least one");
        in.word("layout", out.layout,
                {{"wide", Layout::wide},
                 {"tall", Layout::tall},
                 {"single", Layout::single},
                 {"grid", Layout::grid}});
        in.text("time_zone", out.time_zone);
        in.used_default("time_zone", out.time_zone);
        in.real("clock_offset_s", out.clock_offset_s, {-1e10, 1e10, false});
        in.word("stamp", out.stamp,
                {{"start", Stamp::start}, {"middle", Stamp::middle}, {"end", Stamp::end}});
        in.used_default("stamp", "middle");
        in.real("interval_s", out.interval_s, positive);
        in.word("duplicates", out.duplicates,
                {{"refuse", Duplicates::refuse},
                 {"first", Duplicates::first},
                 {"mean", Duplicates::mean}});
        in.used_default("duplicates", "refuse");
        in.word(
            "align", out.align,
            {{"refuse", Align::refuse}, {"nearest", Align::nearest}, {"linear", Align::linear}});
        in.used_default("align", "refuse");
        out.temperature_unit_said = in.word("temperature_unit", out.temperature_unit,
                                            {{"degC", TemperatureUnit::degC},
                                             {"K", TemperatureUnit::kelvin},
                                             {"degF", TemperatureUnit::degF}});
        in.used_default("temperature_unit", "degC");
        out.distance_unit_said = in.word("distance_unit", out.distance_unit,
                                         {{"m", DistanceUnit::metre},
                                          {"km", DistanceUnit::kilometre},
                                          {"ft", DistanceUnit::foot}});
        in.used_default("distance_unit", "m");
        in.texts("missing", out.missing);
        in.used_default("missing", "\"\", nan, NA, -9999");
        read_valid_range(in, out);
        in.table("text", [&out](TableReader& inner) { read_record_text(inner, out.text); });
        in.table("grid", [&out](TableReader& inner) { read_record_grid(inner, out.grid); });
    });
}

void read_stretches(TableReader& root, Campaign& campaign) {
    root.tables("stretch", [&campaign](TableReader& in) {
        Stretch out;
        out.where = in.where();
        in.require("name", "a name");
        in.require("setting", "streambed, ground, water, air, coil or bath");
        in.require("from_m", "the fibre distance where it begins");
        in.require("to_m", "the fibre distance where it ends");
        if (in.text("name", out.name) && out.name.empty())
            in.problem("name", "is empty; give a name");
        in.word("setting", out.setting,
                {{"streambed", Setting::streambed},
                 {"ground", Setting::ground},
                 {"water", Setting::water},
                 {"air", Setting::air},
                 {"coil", Setting::coil},
                 {"bath", Setting::bath}});
        const bool from = in.real("from_m", out.from_m);
        const bool to = in.real("to_m", out.to_m);
        if (from && to && !(out.from_m < out.to_m))
            in.problem("to_m", text::number(out.to_m) + " is not beyond from_m = " +
                                   text::number(out.from_m) + "; exchange them or correct one");
        in.real("burial_depth_m", out.burial_depth_m, {0.0, 50.0, false});
        in.used_default("burial_depth_m", "0");
        campaign.stretches.push_back(out);
    });
    const bool adjusted = root.has("adjust");
    root.tables("bath", [&campaign, adjusted](TableReader& in) {
        Bath out;
        out.where = in.where();
        in.require("name", "a name");
        in.require("from_m", "the fibre distance where it begins");
        in.require("to_m", "the fibre distance where it ends");
        in.text("name", out.name);
        const bool from = in.real("from_m", out.from_m);
        const bool to = in.real("to_m", out.to_m);
        if (from && to && !(out.from_m < out.to_m))
            in.problem("to_m", text::number(out.to_m) + " is not beyond from_m = " +
                                   text::number(out.from_m) + "; exchange them or correct one");
        in.exclusive({"temperature_c", "probe"});
        const bool constant = in.real("temperature_c", out.temperature_c, {-100.0, 200.0, false});
        const bool probe = in.series("probe", out.probe);
        if (!constant && !probe && !in.has("temperature_c") && !in.has("probe"))
            in.require("temperature_c", "its temperature, or probe = { file, column }");
        out.temperature_sd_said = in.real("temperature_sd_c", out.temperature_sd_c, not_negative);
        if (!out.temperature_sd_said) {
            out.temperature_sd_c = 0.1;
            in.used_default("temperature_sd_c", "0.1");
        }
        out.use = adjusted ? BathUse::adjust : BathUse::validate;
        in.word("use", out.use, {{"adjust", BathUse::adjust}, {"validate", BathUse::validate}});
        in.used_default("use", adjusted ? "adjust" : "validate");
        campaign.baths.push_back(out);
    });
    root.table("adjust", [&campaign](TableReader& in) {
        Adjust out;
        out.where = in.where();
        in.require("method", "offset, offset-and-slope or raman");
        in.word("method", out.method,
                {{"offset", AdjustMethod::offset},
                 {"offset-and-slope", AdjustMethod::offset_and_slope},
                 {"raman", AdjustMethod::raman}});
        campaign.adjust = out;
    });
}

} // namespace rillstrand::campaign

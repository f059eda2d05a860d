// SPDX-License-Identifier: Apache-2.0
#include "findings_json.hpp"

#include "adjust_stage.hpp"
#include "bed_tables.hpp"
#include "cautions.hpp"
#include "column_stage.hpp"
#include "quality_events.hpp"
#include "sha256.hpp"
#include "snow_tables.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <set>

namespace rillstrand::app {

namespace {

std::string layout_word(campaign::Layout layout) {
    switch (layout) {
    case campaign::Layout::wide:
        return "wide";
    case campaign::Layout::tall:
        return "tall";
    case campaign::Layout::single:
        return "single";
    case campaign::Layout::grid:
        return "grid";
    case campaign::Layout::told_from_file:
        break;
    }
    return "";
}

Json record_json(const Session& session) {
    const record::Axes& axes = session.axes();
    const record::GatherReport& g = session.gathered;
    Json gaps = Json::array();
    for (const auto& gap : g.gaps)
        gaps.push_back({{"from", text::iso_time(gap.from_s)}, {"to", text::iso_time(gap.to_s)}});
    const auto samples = static_cast<double>(axes.n_time()) * static_cast<double>(axes.n_place());
    return {{"layout", layout_word(g.layout)},
            {"files", g.files.size()},
            {"traces", axes.n_time()},
            {"channels", axes.n_place()},
            {"first", text::iso_time(axes.time_s(0))},
            {"last", text::iso_time(axes.time_s(axes.n_time() - 1))},
            {"interval_s", number_json(axes.interval_s)},
            {"interval_told", g.interval_told},
            {"from_m", axes.distance_m(0)},
            {"to_m", axes.distance_m(axes.n_place() - 1)},
            {"traces_twice", g.duplicates},
            {"missing_fraction", number_json(1.0 - session.scan->n.sum() / samples)},
            {"out_of_range", g.cells.out_of_range},
            {"gaps", gaps}};
}

/// Enough digits for a reader; the tables' columns carry their own.
Json rounded(double value, double digits) {
    return number_json(std::round(value * digits) / digits);
}

double median_of(const Eigen::ArrayXd& values) {
    std::vector<double> finite;
    for (const double v : values)
        if (std::isfinite(v))
            finite.push_back(v);
    if (finite.empty())
        return NAN;
    const auto middle = finite.begin() + static_cast<std::ptrdiff_t>(finite.size() / 2);
    std::nth_element(finite.begin(), middle, finite.end());
    return *middle;
}

Json quality_json(const Session& session, const Tables& tables) {
    const Table* baths = tables.find("baths");
    std::map<std::string, int> flags;
    for (const auto& flag : session.names.flag)
        ++flags[flag];
    Json legs = nullptr;
    if (session.legs)
        legs = {{"places", session.legs->places},
                {"difference_c", number_json(session.legs->difference_K)},
                {"rmse_c", number_json(session.legs->rmse_K)},
                {"parts_most_fibre_m", number_json(session.legs->largest_fibre_m)},
                {"parts_most_c", number_json(session.legs->largest_K)}};
    return {{"noise_c", number_json(median_of(session.scan->noise_K))},
            {"spatial_response_m", session.spatial_response_m},
            {"flags", flags},
            {"legs", legs},
            {"events", events_json(session)},
            {"adjustment", adjustment_json(session)},
            {"baths", baths == nullptr ? Json::array() : rows_json(*baths)}};
}

Json placement_json(const Session& session, const Tables& tables) {
    if (!session.placement)
        return nullptr;
    const geo::Placement& p = *session.placement;
    return {{"crs", p.crs},
            {"crs_name", p.crs_name},
            {"output_crs", p.output_crs},
            {"output_crs_name", p.output_crs_name},
            {"operation_to_wgs84", p.operation},
            {"operation_accuracy_m", number_json(p.operation_accuracy_m)},
            {"route", p.has_route},
            {"lengths", p.lengths},
            {"first_tie_point", {{"lon", p.first_lon}, {"lat", p.first_lat}}},
            {"slack", number_json(p.slack_mean)},
            {"position_sd_m", number_json(median_of(p.channels.position_sd_m))},
            {"residual_rms_m", number_json(p.residual_rms_m)},
            {"local_scale_mm_km", number_json(p.local_scale_mm_km)},
            {"unplaced_channels", p.unplaced},
            {"tie_points", rows_json(*tables.find("tie_points"))}};
}

Json stream_json(const Session& session, const Tables& tables) {
    Json list = Json::array();
    if (session.streams.empty())
        return list;
    const Json inflows = rows_json(*tables.find("inflows"));
    std::size_t at = 0;
    for (const auto& reach : session.streams) {
        Json own = Json::array();
        for (std::size_t i = 0; i < reach.inflows.size(); ++i)
            own.push_back(inflows.at(at++));
        Json artefacts = Json::array(), refuges = Json::array(), closures = Json::array();
        for (const auto& a : reach.artefacts)
            artefacts.push_back({{"kind", a.kind},
                                 {"fibre_from_m", number_json(a.from_m)},
                                 {"fibre_to_m", number_json(a.to_m)},
                                 {"size_c", number_json(a.size_c)},
                                 {"text", a.text}});
        for (const auto& r : reach.refuges)
            refuges.push_back({{"fibre_from_m", number_json(r.from_m)},
                               {"fibre_to_m", number_json(r.to_m)},
                               {"colder_by_c", number_json(r.colder_by_c)},
                               {"persistence", number_json(r.persistence)}});
        for (const auto& c : reach.closures)
            closures.push_back({{"fibre_from_m", number_json(c.from_m)},
                                {"fibre_to_m", number_json(c.to_m)},
                                {"gauged_gain_m3s", number_json(c.gauged_gain_m3s)},
                                {"gauged_gain_sd_m3s", number_json(c.gauged_gain_sd_m3s)},
                                {"found_gain_m3s", number_json(c.found_gain_m3s)},
                                {"found_gain_sd_m3s", number_json(c.found_gain_sd_m3s)},
                                {"text", c.text}});
        list.push_back({{"stretch", reach.stretch},
                        {"inflows", own},
                        {"resolvable", std::isfinite(reach.detection_limit_median)},
                        {"detection_limit_fraction", rounded(reach.detection_limit_median, 1e6)},
                        {"inflow_temperature_c", rounded(reach.inflow_temperature_c, 1e4)},
                        {"inflow_temperature_sd_c", rounded(reach.inflow_temperature_sd_c, 1e4)},
                        {"inflow_temperature_given", reach.inflow_temperature_given},
                        {"family_level", reach.family_level},
                        {"threshold_score", rounded(reach.threshold_z, 1e4)},
                        {"noise_c", rounded(reach.noise_c, 1e4)},
                        {"drift_c", rounded(reach.drift_c, 1e4)},
                        {"not_inflows", artefacts},
                        {"refuges", refuges},
                        {"closures", closures},
                        {"evidence", reach.evidence},
                        {"cautions", reach.cautions},
                        {"method", reach.method}});
    }
    return list;
}

/// Every file that a campaign names.
std::set<std::filesystem::path> inputs_of(const Session& session) {
    const campaign::Campaign& c = session.campaign;
    std::set<std::filesystem::path> files{session.gathered.files.begin(),
                                          session.gathered.files.end()};
    const auto add = [&files](const std::optional<std::filesystem::path>& file) {
        if (file)
            files.insert(*file);
    };
    const auto add_series = [&files](const std::optional<campaign::SideSeries>& series) {
        if (series)
            files.insert(series->file);
    };
    for (const auto& bath : c.baths)
        add_series(bath.probe);
    if (c.placement) {
        if (!c.placement->tie_points.empty())
            files.insert(c.placement->tie_points);
        add(c.placement->cable_marks);
        add(c.placement->route);
        add(c.placement->river);
        add(c.placement->elevation);
        for (const auto& raster : c.placement->raster)
            files.insert(raster.file);
        if (c.placement->control)
            files.insert(c.placement->control->points);
    }
    for (const auto& s : c.streams) {
        add_series(s.inflow_temperature);
        add_series(s.discharge);
        if (s.weather)
            files.insert(s.weather->file);
        for (const auto& known : s.known)
            add_series(known.temperature);
    }
    for (const auto& s : c.snows)
        add_series(s.air);
    for (const auto& column : c.columns) {
        add_series(column.water_level);
        add_series(column.wind);
        add(column.hypsograph);
    }
    add(c.page_background);
    return files;
}

Json provenance_json(const Session& session, const std::string& now) {
    const campaign::Campaign& c = session.campaign;
    Json inputs = Json::array();
    for (const auto& file : inputs_of(session))
        inputs.push_back({{"file", file.lexically_relative(c.folder).generic_string()},
                          {"sha256", sha256_of(file)}});
    Json defaults = Json::array();
    for (const auto& [key, value] : c.defaults)
        defaults.push_back({{"key", key}, {"value", value}});
    return {{"program", "rillstrand"},
            {"version", RILLSTRAND_VERSION},
            {"time", now},
            {"campaign_file", c.file.filename().string()},
            {"campaign_sha256", sha256_of(c.file)},
            {"inputs", inputs},
            {"defaults", defaults}};
}

} // namespace

Json findings_json(const Session& session, const Tables& tables, const std::string& now) {
    const campaign::Campaign& c = session.campaign;
    return {{"campaign",
             {{"name", c.name},
              {"summary", c.summary},
              {"creator", c.creator},
              {"institution", c.institution},
              {"licence", c.licence},
              {"keywords", c.keywords}}},
            {"record", record_json(session)},
            {"quality", quality_json(session, tables)},
            {"placement", placement_json(session, tables)},
            {"stream", stream_json(session, tables)},
            {"snow", snow_json(session)},
            {"column", column_json(session, tables)},
            {"bed", bed_json(session)},
            {"warnings", warnings_json(session.warnings)},
            {"cautions", cautions_for(c)},
            {"provenance", provenance_json(session, now)}};
}

} // namespace rillstrand::app

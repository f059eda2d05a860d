// SPDX-License-Identifier: Apache-2.0
#include "snow_tables.hpp"

#include "page.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::app {

namespace {

using Reals = std::vector<double>;

std::string date_of(const snow::SnowFindings& f, int day) {
    return day < 0 ? std::string{} : f.days.date[static_cast<std::size_t>(day)];
}

void append(Reals& values, const Eigen::ArrayXd& more) {
    values.insert(values.end(), more.data(), more.data() + more.size());
}

bool any_rule(const Session& session) {
    return std::any_of(session.snows.begin(), session.snows.end(),
                       [](const auto& f) { return f.rule_state.size() > 0; });
}

/// Share of the channels that the fixed thresholds call snow.
double rule_fraction(const snow::SnowFindings& f, Eigen::Index d) {
    double n = 0.0, snow = 0.0;
    for (Eigen::Index j = 0; j < f.rule_state.cols(); ++j) {
        if (f.rule_state(d, j) == snow::State::unknown)
            continue;
        n += 1.0;
        snow += f.rule_state(d, j) == snow::State::snow ? 1.0 : 0.0;
    }
    return n > 0.0 ? snow / n : std::numeric_limits<double>::quiet_NaN();
}

void add_cover(Table& table, const Reals& fraction, const Reals& sd) {
    table.add_real("covered_fraction", "share of the line under snow", "1", fraction, 4);
    table.add_real("covered_fraction_sd", "its standard deviation", "1", sd, 4);
}

Json real_list(const Eigen::ArrayXd& values, int decimals) {
    Json list = Json::array();
    for (const double value : values)
        list.push_back(std::isfinite(value) ? Json::parse(text::fixed(value, decimals))
                                            : Json(nullptr));
    return list;
}

/// Rows of one stretch out of a table of all.
Json rows_of(const Table& table, const std::string& stretch) {
    Json own = Json::array();
    for (auto& row : rows_json(table))
        if (row.at("stretch") == stretch) {
            row.erase("stretch");
            own.push_back(row);
        }
    return own;
}

} // namespace

Table snow_channels_table(const Session& session) {
    Table table{"snow_channels", "When snow cover came and went, channel by channel"};
    std::vector<std::string> stretch, onset, melt_out;
    Reals fibre, melt_sd, days, days_sd, mean_p, insulation, least, most, stands;
    std::vector<std::int64_t> spells;
    for (const auto& f : session.snows) {
        const snow::SnowChannels& c = f.channels;
        for (std::size_t j = 0; j < c.melt_out.size(); ++j) {
            stretch.push_back(f.stretch);
            onset.push_back(date_of(f, c.cover_onset[j]));
            melt_out.push_back(date_of(f, c.melt_out[j]));
            spells.push_back(c.spells[j]);
        }
        append(fibre, c.fibre_m);
        append(melt_sd, c.melt_out_sd_d);
        append(days, c.covered_days);
        append(days_sd, c.covered_days_sd);
        append(mean_p, c.mean_probability);
        append(insulation, c.insulation_index);
        append(least, c.depth_at_least_m);
        append(most, c.depth_at_least_dense_m);
        append(stands, c.under_snow_degC);
    }
    table.add_real("fibre_m", "fibre distance from the instrument", "m", fibre, 3);
    table.add_text("stretch", "stretch", stretch);
    table.add_date("cover_onset", "first day of the longest cover", onset);
    table.add_date("melt_out", "first day without snow after it", melt_out);
    table.add_real("melt_out_sd_d", "its standard deviation", "d", melt_sd, 2);
    table.add_real("covered_days", "days under snow", "d", days, 0);
    table.add_real("covered_days_sd", "their standard deviation", "d", days_sd, 2);
    table.add_integer("spells", "covers, gaps of one day bridged", spells);
    table.add_real("mean_probability", "mean probability of snow", "1", mean_p, 4);
    table.add_real("insulation_index", "swing under snow over swing when bare, by forcing", "1",
                   insulation, 4);
    table.add_real("depth_at_least_m", "lower bound of depth, least of 100 to 500 kg m-3", "m",
                   least, 3);
    table.add_real("depth_at_least_dense_m", "lower bound of depth, most of 100 to 500 kg m-3", "m",
                   most, 3);
    table.add_real("under_snow_c", "where it stands under snow", "degC", stands, 2);
    return table;
}

Table snow_daily_table(const Session& session) {
    Table table{"snow_daily", "Bare or under snow, channel by channel and day by day"};
    std::vector<std::string> stretch, date, state, rule, condition;
    Reals fibre, probability, swing, mean;
    const bool with_rule = any_rule(session);
    for (const auto& f : session.snows)
        for (Eigen::Index d = 0; d < f.days.n_day(); ++d)
            for (Eigen::Index j = 0; j < f.probability.cols(); ++j) {
                stretch.push_back(f.stretch);
                fibre.push_back(f.channels.fibre_m(j));
                date.push_back(f.days.date[static_cast<std::size_t>(d)]);
                state.emplace_back(snow::to_string(f.state(d, j)));
                condition.emplace_back(snow::to_string(f.condition(d, j)));
                probability.push_back(f.probability(d, j));
                swing.push_back(f.days.swing_K(d, j));
                mean.push_back(f.days.mean_degC(d, j));
                if (with_rule)
                    rule.emplace_back(f.rule_state.size() > 0 ? snow::to_string(f.rule_state(d, j))
                                                              : "");
            }
    table.add_real("fibre_m", "fibre distance from the instrument", "m", fibre, 3);
    table.add_text("stretch", "stretch", stretch);
    table.add_date("date", "day of local time", date);
    table.add_text("state", "bare, snow or unknown on more than half of the day", state);
    table.add_real("probability", "probability of snow, by the model", "1", probability, 4);
    table.add_text("condition", "finer than the state, for people", condition);
    if (with_rule)
        table.add_text("rule_state", "by the fixed thresholds", rule);
    table.add_real("swing_c", "swing of the day", "K", swing, 3);
    table.add_real("mean_c", "mean of the day", "degC", mean, 3);
    return table;
}

Table snow_cover_table(const Session& session) {
    Table table{"snow_cover", "Share of the line under snow, day by day"};
    std::vector<std::string> stretch, date;
    Reals fraction, sd, rule, forcing, forcing_sd;
    for (const auto& f : session.snows) {
        append(fraction, f.cover.covered_fraction);
        append(sd, f.cover.covered_fraction_sd);
        append(forcing, f.forcing_K);
        append(forcing_sd, f.forcing_log_sd);
        for (Eigen::Index d = 0; d < f.days.n_day(); ++d) {
            stretch.push_back(f.stretch);
            date.push_back(f.days.date[static_cast<std::size_t>(d)]);
            rule.push_back(f.rule_state.size() > 0 ? rule_fraction(f, d)
                                                   : std::numeric_limits<double>::quiet_NaN());
        }
    }
    table.add_text("stretch", "stretch", stretch);
    table.add_date("date", "day of local time", date);
    add_cover(table, fraction, sd);
    if (any_rule(session))
        table.add_real("rule_fraction", "the same by the fixed thresholds", "1", rule, 4);
    table.add_real("forcing_c", "swing that open bare ground would have shown", "K", forcing, 2);
    table.add_real("forcing_log_sd", "standard deviation of its logarithm", "1", forcing_sd, 2);
    return table;
}

Table snow_classes_table(const Session& session) {
    Table table{"snow_classes", "Share under snow by classes of elevation, slope and aspect"};
    std::vector<std::string> stretch, kind, label, date;
    std::vector<std::int64_t> channels;
    Reals fraction, sd;
    for (const auto& f : session.snows)
        for (const auto& c : f.classes) {
            for (Eigen::Index d = 0; d < f.days.n_day(); ++d) {
                stretch.push_back(f.stretch);
                kind.push_back(c.kind);
                label.push_back(c.label);
                channels.push_back(c.channels);
                date.push_back(f.days.date[static_cast<std::size_t>(d)]);
            }
            append(fraction, c.cover.covered_fraction);
            append(sd, c.cover.covered_fraction_sd);
        }
    table.add_text("stretch", "stretch", stretch);
    table.add_text("kind", "elevation, slope or aspect", kind);
    table.add_text("class", "class", label);
    table.add_integer("channels", "channels in the class", channels);
    table.add_date("date", "day of local time", date);
    add_cover(table, fraction, sd);
    return table;
}

std::vector<SnowRaster> snow_rasters(const Session& session) {
    if (session.snows.empty())
        return {};
    const record::Axes& axes = session.axes();
    const Reals missing(static_cast<std::size_t>(axes.n_place()),
                        std::numeric_limits<double>::quiet_NaN());
    const double from_s = session.snows.front().days.first_s(0);
    SnowRaster probability{"Mean probability of snow", "1", "snow_probability.tif", missing};
    SnowRaster melt_out{"Melt-out", "days since " + session.snows.front().days.date.front(),
                        "snow_melt_out.tif", missing};
    for (const auto& f : session.snows)
        for (Eigen::Index j = 0; j < f.channels.fibre_m.size(); ++j) {
            const auto range =
                record::places_between(axes, f.channels.fibre_m(j), f.channels.fibre_m(j));
            const auto at = static_cast<std::size_t>(range.first);
            const int day = f.channels.melt_out[static_cast<std::size_t>(j)];
            probability.value[at] = f.channels.mean_probability(j);
            if (day >= 0)
                melt_out.value[at] = std::round((f.days.first_s(day) - from_s) / 86400.0);
        }
    return {probability, melt_out};
}

Json snow_json(const Session& session) {
    Json list = Json::array();
    const Table channels = snow_channels_table(session), cover = snow_cover_table(session);
    for (const auto& f : session.snows) {
        const bool rule = f.method == campaign::SnowMethod::threshold;
        list.push_back(
            {{"stretch", f.stretch},
             {"method", rule ? "threshold" : "model"},
             {"day_begins_h_utc", number_json(std::round(-f.days.offset_s / 36.0) / 100)},
             {"noise_c", number_json(f.days.noise_K.mean())},
             {"neighbour_share", number_json(std::round(1000.0 * f.leak) / 1000.0)},
             {"channels", rows_of(channels, f.stretch)},
             {"cover", rows_of(cover, f.stretch)},
             {"cautions", f.cautions},
             {"method_text", f.method_text}});
    }
    return list;
}

Json snow_page_json(const Session& session) {
    Json list = Json::array();
    for (const auto& f : session.snows) {
        constexpr Eigen::Index most_rows = 400, most_columns = 1200;
        const Eigen::Index n = f.days.n_day(), places = f.probability.cols();
        const Eigen::Index step_d = (n + most_rows - 1) / most_rows,
                           step_j = (places + most_columns - 1) / most_columns;
        std::string bytes;
        Eigen::Index rows = 0, columns = 0;
        for (Eigen::Index d = 0; d < n; d += step_d, ++rows) {
            columns = 0;
            for (Eigen::Index j = 0; j < places; j += step_j, ++columns) {
                const double p =
                    f.probability.block(d, j, std::min(step_d, n - d), std::min(step_j, places - j))
                        .mean();
                bytes += static_cast<char>(std::isnan(p) ? 255 : std::lround(254.0 * p));
            }
        }
        Json fibre = Json::array();
        for (Eigen::Index j = 0; j < places; j += step_j)
            fibre.push_back(Json::parse(text::fixed(f.channels.fibre_m(j), 2)));
        Json melt = Json::array(), melt_sd = real_list(f.channels.melt_out_sd_d, 2);
        for (const int day : f.channels.melt_out)
            melt.push_back(day < 0 ? Json(nullptr) : Json(f.days.first_s(day) + 43200.0));
        list.push_back({{"stretch", f.stretch},
                        {"rows", rows},
                        {"columns", columns},
                        {"date", f.days.date},
                        {"days_a_row", step_d},
                        {"fibre_m", fibre},
                        {"channel_m", real_list(f.channels.fibre_m, 2)},
                        {"melt_out_s", melt},
                        {"melt_out_sd_d", melt_sd},
                        {"codes", page::base64(bytes)}});
    }
    return list;
}

void tell_snow(const Session& session, std::ostream& out) {
    for (const auto& f : session.snows) {
        out << "snow '" << f.stretch << "': " << f.probability.cols() << " channels, "
            << f.days.n_day() << " days";
        Reals days;
        for (const double value : f.channels.covered_days)
            if (std::isfinite(value))
                days.push_back(value);
        std::sort(days.begin(), days.end());
        if (!days.empty())
            out << ", covered on " << text::fixed(days[days.size() / 2], 0) << " (median)";
        std::vector<int> melts;
        for (const int day : f.channels.melt_out)
            if (day >= 0)
                melts.push_back(day);
        std::sort(melts.begin(), melts.end());
        if (!melts.empty())
            out << "; melt-out from " << date_of(f, melts.front()) << " to "
                << date_of(f, melts.back()) << " on " << melts.size() << " channels";
        out << '\n';
    }
}

} // namespace rillstrand::app

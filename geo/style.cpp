// SPDX-License-Identifier: Apache-2.0
#include "style.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <map>
#include <set>

namespace rillstrand::geo {

namespace {
constexpr int colour_classes = 7;
constexpr int halo_classes = 3;
constexpr std::size_t most_names = 24;
constexpr double point_px = 7.0;
constexpr double line_px = 3.0;
constexpr std::array<double, halo_classes> halo_px{12.0, 18.0, 26.0};
constexpr Rgb plain{70, 90, 110};
constexpr Rgb no_value{170, 170, 170};

bool any_value(const Column& column) {
    if (column.kind == ColumnKind::real)
        return std::any_of(column.real.begin(), column.real.end(),
                           [](double v) { return std::isfinite(v); });
    if (column.kind == ColumnKind::text)
        return std::any_of(column.text.begin(), column.text.end(),
                           [](const std::string& v) { return !v.empty(); });
    return column.kind == ColumnKind::boolean && column.size() > 0;
}

/// The first of the columns that is there and holds a value.
std::string first_of(const Table& table, const std::vector<std::string>& names) {
    for (const auto& name : names)
        if (const Column* column = table.find(name); column != nullptr && any_value(*column))
            return name;
    return {};
}

std::string first_measured(const Table& table) {
    const std::set<std::string> places{"fibre_m", "station_m", "position_sd_m", "x",
                                       "y",       "z",         "lon",           "lat"};
    for (const auto& column : table.columns())
        if (column.kind == ColumnKind::real && !places.contains(column.name) && any_value(column))
            return column.name;
    return {};
}

struct Habit {
    std::vector<std::string> colour_by, halo_by, label_by;
    bool waypoints = false;
};

/// How the layers of formats.md are looked at.
Habit habit_of(const std::string& layer) {
    static const std::map<std::string, Habit> habits{
        {"channels", {{"mean_c"}, {"position_sd_m"}, {}}},
        {"cable", {{"stretch"}, {}, {"stretch"}}},
        {"tie_points", {{"used", "slack"}, {"sd_m"}, {"label"}}},
        {"inflows",
         {{"fraction", "contrast_c"}, {"fraction_sd", "temperature_sd_c"}, {"kind"}, true}},
        {"stream_channels", {{"anomaly_c"}, {"position_sd_m"}, {}}},
        {"snow_daily", {{"state"}, {}, {}}},
        {"snow_channels", {{"covered_days", "mean_probability"}, {"melt_out_sd_d"}, {}}}};
    const auto found = habits.find(layer);
    return found == habits.end() ? Habit{} : found->second;
}

bool is_named(const std::string& name, const Table& table) {
    return !name.empty() && table.find(name) != nullptr;
}

/// Four figures are enough for a legend.
std::string short_number(double value) {
    std::array<char, 64> buffer{};
    const auto result = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value,
                                      std::chars_format::general, 4);
    return {buffer.data(), result.ptr};
}

std::string with_unit(std::string text, const Column& column) {
    if (!column.unit.empty() && column.unit != "1")
        text += " " + column.unit;
    return text;
}

std::vector<StyleRule> range_rules(const Column& column, const std::vector<double>& limits) {
    std::vector<StyleRule> rules;
    for (std::size_t i = 0; i + 1 < limits.size(); ++i) {
        StyleRule rule;
        rule.test = StyleRule::Test::range;
        rule.column = column.name;
        rule.from = limits[i];
        rule.to = limits[i + 1];
        rule.closed = i + 2 == limits.size();
        rule.label = with_unit(short_number(rule.from) +
                                   (rule.from < rule.to ? " to " + short_number(rule.to) : ""),
                               column);
        rules.push_back(std::move(rule));
    }
    return rules;
}

std::vector<StyleRule> name_rules(const Column& column) {
    std::vector<std::string> names;
    std::set<std::string> seen;
    for (std::size_t row = 0; row < column.size(); ++row) {
        std::string name = cell_text(column, row);
        if (name.empty() || names.size() == most_names || !seen.insert(name).second)
            continue;
        names.push_back(std::move(name));
    }
    const auto colours = categorical_colours(static_cast<int>(names.size()));
    std::vector<StyleRule> rules;
    for (std::size_t i = 0; i < names.size(); ++i) {
        StyleRule rule;
        rule.test = StyleRule::Test::equal;
        rule.column = column.name;
        rule.value = names[i];
        rule.is_boolean = column.kind == ColumnKind::boolean;
        rule.label = rule.is_boolean ? column.name + ": " + names[i] : names[i];
        rule.colour = colours[i];
        rules.push_back(std::move(rule));
    }
    return rules;
}

std::vector<StyleRule> colour_rules(const Column& column, bool diverging) {
    if (column.kind != ColumnKind::real)
        return name_rules(column);
    auto rules = range_rules(column, class_limits(column.real, colour_classes, diverging));
    const int count = static_cast<int>(rules.size());
    const auto colours = diverging ? diverging_colours(count) : sequential_colours(count);
    for (std::size_t i = 0; i < rules.size(); ++i)
        rules[i].colour = colours[i];
    return rules;
}

StyleRule one_symbol(StyleRule::Test test, Rgb colour, const std::string& label) {
    StyleRule rule;
    rule.test = test;
    rule.colour = colour;
    rule.label = label;
    return rule;
}

std::vector<StyleRule> halo_rules(const Column& column) {
    auto rules = range_rules(column, class_limits(column.real, halo_classes, false));
    for (std::size_t i = 0; i < rules.size(); ++i) {
        rules[i].colour = plain;
        rules[i].opacity = 0.25;
        rules[i].size_px = halo_px.at(std::min(i, halo_px.size() - 1));
        rules[i].outline = false;
        rules[i].label = "halo: " + column.name + " " + rules[i].label;
    }
    return rules;
}
} // namespace

Look complete_look(const Layer& layer) {
    return complete_look(layer.table, layer.look);
}

Look complete_look(const Table& table, Look look) {
    const Habit habit = habit_of(text::slug(table.name()));
    if (!is_named(look.colour_by, table))
        look.colour_by = first_of(table, habit.colour_by);
    if (look.colour_by.empty())
        look.colour_by = first_measured(table);
    if (!is_named(look.halo_by, table))
        look.halo_by = first_of(table, habit.halo_by);
    if (!is_named(look.label_by, table))
        look.label_by = first_of(table, habit.label_by);
    if (!is_named(look.time_by, table))
        look.time_by.clear();
    look.diverging =
        look.diverging || look.colour_by == "anomaly_c" || look.colour_by == "contrast_c";
    look.waypoints = look.waypoints || habit.waypoints;
    return look;
}

LayerStyle make_style(const Table& table, GeometryKind geometry, const Look& look) {
    LayerStyle style;
    style.layer = text::slug(table.name());
    style.title = table.title();
    style.geometry = geometry;
    if (const Column* time = table.find(look.time_by)) {
        style.time_by = time->name;
        style.time_is_date = time->kind == ColumnKind::date;
    }
    const Column* halo = table.find(look.halo_by);
    const bool points = geometry == GeometryKind::point || geometry == GeometryKind::point_z;
    if (points && halo != nullptr && halo->kind == ColumnKind::real)
        style.halos = halo_rules(*halo);
    if (const Column* column = table.find(look.colour_by); column != nullptr && any_value(*column))
        style.classes = colour_rules(*column, look.diverging);
    if (style.classes.empty())
        style.classes.push_back(one_symbol(StyleRule::Test::all, plain, style.title));
    else
        style.classes.push_back(one_symbol(StyleRule::Test::otherwise, no_value, "no value"));
    for (auto& rule : style.classes)
        rule.size_px = points ? point_px : line_px;
    return style;
}

LayerStyle make_style(const Layer& layer) {
    return make_style(layer.table, layer.geometry, complete_look(layer));
}

std::optional<std::size_t> matching_class(const LayerStyle& style, const Table& table,
                                          std::size_t row) {
    for (std::size_t i = 0; i < style.classes.size(); ++i) {
        const auto& rule = style.classes[i];
        if (rule.test == StyleRule::Test::all || rule.test == StyleRule::Test::otherwise)
            return i;
        const Column* column = table.find(rule.column);
        if (column == nullptr)
            continue;
        if (rule.test == StyleRule::Test::equal) {
            if (cell_text(*column, row) == rule.value)
                return i;
            continue;
        }
        const double value = column->real[row];
        if (value >= rule.from && (value < rule.to || (rule.closed && value <= rule.to)))
            return i;
    }
    return std::nullopt;
}

} // namespace rillstrand::geo

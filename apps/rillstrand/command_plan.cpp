// SPDX-License-Identifier: Apache-2.0
#include "command_plan.hpp"

#include "table_json.hpp"

#include "base/text.hpp"
#include "quality/plan.hpp"

#include <CLI/CLI.hpp>

#include <algorithm>
#include <cmath>

namespace rillstrand::app {

namespace {

/// Three significant digits, without an exponent.
std::string short_number(double value) {
    if (!std::isfinite(value))
        return "none";
    if (value == 0.0)
        return "0";
    const int before = static_cast<int>(std::floor(std::log10(std::abs(value))));
    return text::fixed(value, std::clamp(2 - before, 0, 9));
}

Table plan_table(const std::vector<quality::PlanRow>& rows) {
    std::vector<std::string> quantity, unit, formula, source, remark;
    std::vector<double> value;
    for (const auto& row : rows) {
        quantity.push_back(row.quantity);
        value.push_back(row.value);
        unit.push_back(row.unit);
        formula.push_back(row.formula);
        source.push_back(row.source);
        remark.push_back(row.remark);
    }
    Table table{"plan", "What an instrument and a cable will be able to show"};
    table.add_text("quantity", "Quantity", quantity);
    table.add_real("value", "Value", "", value);
    table.add_text("unit", "Unit", unit);
    table.add_text("formula", "Formula", formula);
    table.add_text("source", "Source of the formula", source);
    table.add_text("remark", "Remark", remark);
    return table;
}

void tell_plan(const std::vector<quality::PlanRow>& rows, std::ostream& out) {
    std::size_t widest = 0;
    for (const auto& row : rows)
        widest = std::max(widest, row.quantity.size());
    for (const auto& row : rows) {
        const std::string value = short_number(row.value);
        out << row.quantity << std::string(widest - row.quantity.size() + 2, ' ')
            << std::string(9 - std::min<std::size_t>(9, value.size()), ' ') << value;
        if (row.unit != "1")
            out << ' ' << row.unit;
        if (!row.remark.empty())
            out << "  (" << row.remark << ')';
        out << '\n';
    }
    out << "\nFormulas and sources\n";
    for (const auto& row : rows)
        out << "  " << row.quantity << ": " << row.formula << "; " << row.source << '\n';
}

void declare_instrument(CLI::App& command, quality::PlanInput& p) {
    command.add_option("--noise-c", p.noise_K, "Noise (1 sd) of one sample at the near end, K")
        ->required();
    command.add_option("--interval-s", p.interval_s, "Time that one sample averages, s")
        ->capture_default_str();
    command.add_option("--average-s", p.average_s, "Averaging time asked about, s")
        ->capture_default_str();
    command.add_option("--floor-c", p.floor_K, "What no averaging takes away (drift), K")
        ->capture_default_str();
    command.add_option("--spacing-m", p.spacing_m, "Sampling along the fibre, m")
        ->capture_default_str();
    command.add_option("--response-m", p.response_m, "10-90 % spatial response, m")
        ->capture_default_str();
    command.add_option("--length-m", p.length_m, "Fibre from the instrument to its end, m");
    command.add_option("--loss-db-km", p.loss_dB_km, "One-way loss of the fibre, dB/km")
        ->capture_default_str();
    command.add_option("--refractive-index", p.refractive_index, "Of the fibre's core")
        ->capture_default_str();
}

void declare_site(CLI::App& command, quality::PlanInput& p) {
    command.add_option("--contrast-c", p.contrast_K, "Inflow minus stream temperature, K");
    command.add_option("--discharge-m3s", p.discharge_m3s, "Discharge of the stream, m3/s");
    command.add_option("--share", p.share, "Share of discharge that is to be found")
        ->capture_default_str();
    command.add_option("--reach-m", p.reach_m, "Length averaged on each side of an inflow, m")
        ->capture_default_str();
    command.add_option("--spot-m", p.spot_m, "Width of a warm or cold patch on the bed, m");
    command.add_option("--probe-sd-c", p.probe_sd_K, "Error (1 sd) of a bath's probe, K")
        ->capture_default_str();
    command.add_option("--target-sd-c", p.target_sd_K, "Error (1 sd) wanted of temperatures, K")
        ->capture_default_str();
    command.add_option("--winding-diameter-m", p.winding_diameter_m,
                       "Diameter of a winding around a column, to the fibre's axis, m");
    command.add_option("--winding-pitch-m", p.winding_pitch_m, "Height of one turn, m");
}

} // namespace

void add_plan(CLI::App& app, Job& job) {
    const auto input = std::make_shared<quality::PlanInput>();
    const auto csv = std::make_shared<bool>(false);
    CLI::App* command = app.add_subcommand(
        "plan", "Before going to the field: what instrument and cable will be able to show");
    declare_instrument(*command, *input);
    declare_site(*command, *input);
    command->add_flag("--csv", *csv, "Write a table with commas");
    command->footer("Example: rillstrand plan --noise-c 0.1 --interval-s 30 --contrast-c 5 "
                    "--discharge-m3s 0.2\n"
                    "Left out: what is not said. An inflow counts as found three sd from none. "
                    "Treat every open\nfibre end as live: never look into a connector.");
    command->callback([input, csv, &job] {
        job = [input, csv](const Context& context) {
            const auto rows = quality::make_plan(*input);
            if (*csv)
                context.out << to_csv(plan_table(rows));
            else
                tell_plan(rows, context.out);
        };
    });
}

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#include "command_run.hpp"

#include "pipeline.hpp"

#include <CLI/CLI.hpp>

namespace rillstrand::app {

void add_run(CLI::App& app, Job& job) {
    auto file = std::make_shared<std::string>();
    CLI::App* command = app.add_subcommand(
        "run", "Do all that a campaign asks for: record, layers, tables, findings, page");
    command->add_option("campaign", *file, "Campaign file (TOML)")->required();
    command->callback(
        [file, &job] { job = [file](const Context& context) { run_all(*file, context); }; });
}

} // namespace rillstrand::app

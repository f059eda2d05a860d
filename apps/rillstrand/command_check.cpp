// SPDX-License-Identifier: Apache-2.0
#include "command_check.hpp"

#include "pipeline.hpp"

#include <CLI/CLI.hpp>

namespace rillstrand::app {

namespace {

void run_check(const std::string& file, const Context& context) {
    context.progress.stage("checking the campaign", 0.0, "");
    const campaign::Campaign campaign = checked_campaign(file);
    context.out << campaign.file.filename().string() << ": good; results will go to "
                << campaign.output.string() << '\n';
    for (const auto& [key, value] : campaign.defaults)
        context.out << "  " << key << " is not said, " << value << " is taken\n";
}

} // namespace

void add_check(CLI::App& app, Job& job) {
    auto file = std::make_shared<std::string>();
    CLI::App* command = app.add_subcommand(
        "check", "Read a campaign file and the heads of its inputs; tell all problems at once");
    command->add_option("campaign", *file, "Campaign file (TOML)")->required();
    command->callback(
        [file, &job] { job = [file](const Context& context) { run_check(*file, context); }; });
}

} // namespace rillstrand::app

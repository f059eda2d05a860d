// SPDX-License-Identifier: Apache-2.0
#include "command_draft.hpp"

#include "campaign/draft.hpp"

#include <CLI/CLI.hpp>

namespace rillstrand::app {

void add_draft(CLI::App& app, Job& job) {
    auto folder = std::make_shared<std::string>(".");
    CLI::App* command = app.add_subcommand(
        "draft", "Write a commented campaign file from what lies in a folder, to standard output");
    command->add_option("folder", *folder, "Folder with traces and side files")
        ->capture_default_str();
    command->callback([folder, &job] {
        job = [folder](const Context& context) {
            context.out << campaign::draft_campaign(campaign::look_into(*folder));
        };
    });
}

} // namespace rillstrand::app

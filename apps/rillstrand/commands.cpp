// SPDX-License-Identifier: Apache-2.0
#include "commands.hpp"

#include "command_check.hpp"
#include "command_draft.hpp"
#include "command_plan.hpp"
#include "command_run.hpp"
#include "command_stages.hpp"

namespace rillstrand::app {

void add_commands(CLI::App& app, Job& job) {
    add_draft(app, job);
    add_check(app, job);
    add_run(app, job);
    add_stages(app, job);
    add_plan(app, job);
}

} // namespace rillstrand::app

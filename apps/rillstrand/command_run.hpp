// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"

namespace rillstrand::app {

/// `run CAMPAIGN`: does all that the campaign asks for.
void add_run(CLI::App& app, Job& job);

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"

namespace rillstrand::app {

/// `check CAMPAIGN`: reads the campaign file and the heads of its inputs, reports all problems.
void add_check(CLI::App& app, Job& job);

} // namespace rillstrand::app

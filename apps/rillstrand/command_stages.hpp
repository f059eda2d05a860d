// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"

namespace rillstrand::app {

/// `gather`, `assess`, `place`, `stream`, `snow`, `column`, `bed`: the stages of `run`, each alone.
void add_stages(CLI::App& app, Job& job);

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"

namespace rillstrand::app {

/// `plan`: what an instrument and a cable will be able to show, before anything is laid.
void add_plan(CLI::App& app, Job& job);

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"

namespace rillstrand::app {

/// `draft FOLDER`: writes a commented campaign file from what lies in a folder.
void add_draft(CLI::App& app, Job& job);

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/progress.hpp"

#include <functional>
#include <ostream>
#include <string>

namespace CLI {
class App;
}

namespace rillstrand::app {

/// What every command is given: where results and remarks go, and who watches.
struct Context {
    std::ostream& out; ///< results in short
    std::ostream& log; ///< remarks and warnings
    Progress& progress;
    std::string now; ///< ISO 8601, UTC: the one reading of the clock of this run
};

/// What is left to do once the words on the command line are understood.
using Job = std::function<void(const Context&)>;

/// Declares every command; a command that was chosen leaves its work in `job`.
void add_commands(CLI::App& app, Job& job);

} // namespace rillstrand::app

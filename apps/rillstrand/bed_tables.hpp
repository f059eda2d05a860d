// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "session.hpp"
#include "table_json.hpp"

#include "base/table.hpp"

#include <ostream>
#include <vector>

namespace rillstrand::app {

/// `bed_<name>`: a row a time by the best method; then, over all [[bed]]s, `beds_methods`: every
/// method, the best first; and `beds_depths`: the daily wave by depth.
std::vector<Table> bed_tables(const Session& session);

/// The block `bed` of the findings.
Json bed_json(const Session& session);

/// Results in short.
void tell_beds(const Session& session, std::ostream& out);

} // namespace rillstrand::app

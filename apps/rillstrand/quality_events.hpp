// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "session.hpp"
#include "table_json.hpp"

#include "base/progress.hpp"
#include "commands.hpp"

namespace rillstrand::app {

/// Faults of the record: fills session.events and says in a warning how many there are.
void events_stage(Session& session, const Context& context);

/// Table `events`: kind, place, time, size, evidence, what was done.
Table events_table(const Session& session);

/// `quality.events` of the findings.
Json events_json(const Session& session);

} // namespace rillstrand::app

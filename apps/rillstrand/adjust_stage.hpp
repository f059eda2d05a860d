// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"
#include "output.hpp"
#include "session.hpp"
#include "table_json.hpp"

namespace rillstrand::app {

/// What a bath's probe, or its stated temperature, says at each trace.
quality::BathReference bath_reference(const Session& session, const campaign::Bath& bath);

/// With [adjust]: adjusts the gathered record to its baths and puts the adjusted one in its place.
void adjust_stage(Session& session, const Output& output, const Context& context);

/// What was adjusted; null without.
Json adjustment_json(const Session& session);

void tell_adjustment(const Session& session, std::ostream& out);

} // namespace rillstrand::app

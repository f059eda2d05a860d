// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"
#include "layer_tables.hpp"
#include "session.hpp"

namespace rillstrand::app {

/// Reads what each [[column]] needs and tells its layers.
void column_stage(Session& session, const Context& context);

/// Problems of the columns that show without the record's temperatures.
void check_columns(const campaign::Campaign& campaign, Problems& problems);

/// `column_<name>`, its isotherms, its profiles with positions, its diffusivity.
void add_column_tables(const Session& session, Tables& tables);

Json column_json(const Session& session, const Tables& tables);

/// Profiles and isotherms for the page's pictures.
Json column_pictures(const Session& session);

void tell_columns(const Session& session, std::ostream& out);

} // namespace rillstrand::app

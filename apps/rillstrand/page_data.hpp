// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "layer_tables.hpp"
#include "session.hpp"
#include "table_json.hpp"

#include <string>

namespace rillstrand::app {

/// The whole page as one HTML text.
std::string page_of(const Session& session, const Tables& tables, const Json& findings);

} // namespace rillstrand::app

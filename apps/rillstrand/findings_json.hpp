// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "layer_tables.hpp"
#include "session.hpp"
#include "table_json.hpp"

namespace rillstrand::app {

/// Everything found, with provenance: the content of findings.json.
Json findings_json(const Session& session, const Tables& tables, const std::string& now);

} // namespace rillstrand::app

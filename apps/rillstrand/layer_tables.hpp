// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "output.hpp"
#include "session.hpp"
#include "table_json.hpp"

#include "base/table.hpp"

#include <ostream>
#include <vector>

namespace rillstrand::app {

/// Findings as tables; where they have a place, its row in the layer of the same name is the same.
struct Tables {
    std::vector<Table> all;
    const Table* find(const std::string& name) const;
};

Tables make_tables(const Session& session);

/// The tables as layers in every format that the campaign asks for, into the staging folder.
void write_all_layers(const Session& session, const Tables& tables, const Json& findings,
                      const Output& output, const std::string& now);

/// Results in short.
void tell_findings(const Session& session, std::ostream& out);

} // namespace rillstrand::app

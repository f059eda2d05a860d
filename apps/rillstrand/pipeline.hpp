// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"
#include "output.hpp"
#include "session.hpp"

namespace rillstrand::app {

/// Reads a campaign file and the heads of its inputs.
/// @throws DataError with all problems at once
campaign::Campaign checked_campaign(const std::filesystem::path& file);

/// The stages of a run, in their order. Each needs what the ones before it filled.
void gather_stage(Session& session, const Output& output, const Context& context);
void assess_stage(Session& session, const Context& context);
void place_stage(Session& session, const Context& context);
void stream_stage(Session& session, const Context& context);

/// Everything, into the output folder.
void run_all(const std::filesystem::path& campaign_file, const Context& context);

/// Warnings in words, one a line.
void tell_warnings(const Warnings& warnings, std::ostream& log);

} // namespace rillstrand::app

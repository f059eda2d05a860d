// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"
#include "session.hpp"

namespace rillstrand::app {

/// Tells bare from snow-covered ground for every [[snow]] of the campaign.
void snow_stage(Session& session, const Context& context);

} // namespace rillstrand::app

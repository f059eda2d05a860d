// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "commands.hpp"
#include "session.hpp"

namespace rillstrand::app {

/// What is wrong with the [[bed]]s that the heads of the record already show.
void check_beds(const campaign::Campaign& campaign, const Eigen::ArrayXd& distance_m,
                Problems& problems);

/// Tells the vertical flux of water for every [[bed]] of the campaign.
void bed_stage(Session& session, const Context& context);

} // namespace rillstrand::app

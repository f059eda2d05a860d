// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>
#include <utility>
#include <vector>

/// CF grid mappings; included by sources of this room only.
namespace rillstrand::store {

/// Attributes of a CF grid mapping variable beside `crs_wkt`; empty where the projection is none
/// of those named here (then crs_wkt alone says it).
struct GridMapping {
    bool projected = false;
    std::vector<std::pair<std::string, std::string>> texts;
    std::vector<std::pair<std::string, std::vector<double>>> numbers;
};

/// Geographic systems, transverse Mercator, and Lambert conformal conic with two parallels.
/// Source: CF conventions 1.11, appendix F.
GridMapping grid_mapping_of(const std::string& wkt);

} // namespace rillstrand::store

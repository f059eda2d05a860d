// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "layers.hpp"

#include <filesystem>

/// An invented set of layers that holds everything that can go wrong in a file format.
namespace rillstrand::geo::sample {

inline constexpr const char* hostile =
    "B\xC3\xA4"
    "chle's \"quoted\"; DROP TABLE channels;-- <script>alert(1)</script> & \xD7\xA9 ]]>";

/// Three channels (one without a place), two stretches of cable, an inflow, snow by day and a
/// column in time; EPSG:25832.
LayerSet layer_set();

/// An empty folder of that name in the test's scratch folder.
std::filesystem::path fresh_folder(const std::string& name);

} // namespace rillstrand::geo::sample

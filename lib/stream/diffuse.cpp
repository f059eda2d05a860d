// SPDX-License-Identifier: Apache-2.0
#include "stream/diffuse.hpp"

namespace rillstrand::stream {

std::vector<DiffuseGain> find_diffuse(const Context&) {
    return {};
}

} // namespace rillstrand::stream

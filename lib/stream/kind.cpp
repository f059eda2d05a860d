// SPDX-License-Identifier: Apache-2.0
#include "stream/stream.hpp"

namespace rillstrand::stream {

std::string to_string(Kind kind) {
    switch (kind) {
    case Kind::step:
        return "step";
    case Kind::spot:
        return "spot";
    case Kind::diffuse:
        return "diffuse";
    }
    return {};
}

} // namespace rillstrand::stream

// SPDX-License-Identifier: Apache-2.0
#include "heights.hpp"

#include <algorithm>
#include <limits>

namespace rillstrand::geo {

double height_between(const std::vector<std::pair<double, double>>& known, double path_m) {
    if (known.empty())
        return std::numeric_limits<double>::quiet_NaN();
    const auto next = std::upper_bound(known.begin(), known.end(), std::pair{path_m, 1e300});
    if (next == known.begin())
        return known.front().second;
    if (next == known.end())
        return known.back().second;
    const auto before = next - 1;
    const double w = (path_m - before->first) / (next->first - before->first);
    return before->second + w * (next->second - before->second);
}

} // namespace rillstrand::geo

// SPDX-License-Identifier: Apache-2.0
#include "style.hpp"

#include <Eigen/Core>

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <cstdio>

namespace rillstrand::geo {

namespace {
// Ends of the ramps in L*, a*, b*, chosen so that the straight lines between them stay inside sRGB.
const Eigen::Vector3d ramp_dark{22.0, 12.0, -38.0};
const Eigen::Vector3d ramp_light{90.0, -4.0, 56.0};
const Eigen::Vector3d below_zero{45.0, 2.0, -42.0};
const Eigen::Vector3d at_zero{94.0, 0.0, 2.0};
const Eigen::Vector3d above_zero{45.0, 36.0, 52.0};

std::uint8_t screen_value(double linear) {
    const double clipped = std::clamp(linear, 0.0, 1.0);
    const double encoded =
        clipped <= 0.0031308 ? 12.92 * clipped : 1.055 * std::pow(clipped, 1.0 / 2.4) - 0.055;
    return static_cast<std::uint8_t>(std::lround(255.0 * encoded));
}

Rgb between(const Eigen::Vector3d& from, const Eigen::Vector3d& to, double share) {
    const Eigen::Vector3d lab = from + share * (to - from);
    return rgb_from_lab(lab.x(), lab.y(), lab.z());
}

/// Steps of 1, 2, 2.5 or 5 times a power of ten, the smallest that is not less than the width.
double round_step(double width) {
    const double power = std::pow(10.0, std::floor(std::log10(width)));
    for (const double factor : {1.0, 2.0, 2.5, 5.0})
        if (factor * power >= width * (1.0 - 1e-9))
            return factor * power;
    return 10.0 * power;
}

/// The decimal number that a product of steps stands for: 3 times 0.025 is 0.075 and no more.
double tidy(double value) {
    std::array<char, 64> buffer{};
    const auto text = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value,
                                    std::chars_format::scientific, 11);
    double result = value;
    (void)std::from_chars(buffer.data(), text.ptr, result);
    return result;
}

double quantile(const std::vector<double>& sorted, double share) {
    const double place = share * static_cast<double>(sorted.size() - 1);
    const auto below = static_cast<std::size_t>(place);
    const std::size_t above = std::min(below + 1, sorted.size() - 1);
    return sorted[below] + (place - static_cast<double>(below)) * (sorted[above] - sorted[below]);
}

std::vector<double> round_limits(double low, double high, int count) {
    for (double step = round_step((high - low) / count);; step = round_step(step * 1.01)) {
        std::vector<double> limits{low};
        for (double k = std::floor(low / step) + 1.0; k * step < high; k += 1.0)
            if (k * step > low)
                limits.push_back(tidy(k * step));
        limits.push_back(high);
        if (limits.size() <= static_cast<std::size_t>(count) + 1)
            return limits;
    }
}

std::vector<double> quantile_limits(const std::vector<double>& sorted, int count) {
    std::vector<double> limits;
    for (int i = 0; i <= count; ++i)
        limits.push_back(quantile(sorted, 1.0 * i / count));
    limits.erase(std::unique(limits.begin(), limits.end()), limits.end());
    return limits;
}

/// Whether one class holds more than half of the values.
bool is_lopsided(const std::vector<double>& sorted, const std::vector<double>& limits) {
    for (std::size_t i = 0; i + 1 < limits.size(); ++i) {
        const auto from = std::lower_bound(sorted.begin(), sorted.end(), limits[i]);
        const auto to = std::lower_bound(sorted.begin(), sorted.end(), limits[i + 1]);
        if (2 * (to - from) > static_cast<std::ptrdiff_t>(sorted.size()))
            return true;
    }
    return false;
}

std::vector<double> diverging_limits(const std::vector<double>& sorted, int count) {
    const int odd = count % 2 == 0 ? count - 1 : count;
    std::vector<double> sizes;
    sizes.reserve(sorted.size());
    for (const double v : sorted)
        sizes.push_back(std::abs(v));
    std::sort(sizes.begin(), sizes.end());
    const double usual = quantile(sizes, 0.95) > 0.0 ? quantile(sizes, 0.95) : sizes.back();
    if (usual == 0.0)
        return {0.0, 0.0};
    const double width = round_step(2.0 * usual / odd);
    std::vector<double> limits;
    for (int i = 1; i < odd; ++i)
        limits.push_back(tidy((i - 0.5 * odd) * width));
    const double end = std::max(sizes.back(), 0.5 * odd * width);
    limits.insert(limits.begin(), -end);
    limits.push_back(end);
    return limits;
}
} // namespace

std::string hex(Rgb colour) {
    std::array<char, 16> buffer{};
    std::snprintf(buffer.data(), buffer.size(), "#%02x%02x%02x", static_cast<unsigned>(colour.r),
                  static_cast<unsigned>(colour.g), static_cast<unsigned>(colour.b));
    return buffer.data();
}

Rgb rgb_from_lab(double lightness, double a, double b) {
    const auto inverse = [](double t) {
        const double delta = 6.0 / 29.0;
        return t > delta ? t * t * t : 3.0 * delta * delta * (t - 4.0 / 29.0);
    };
    const double fy = (lightness + 16.0) / 116.0;
    const Eigen::Vector3d xyz{0.95047 * inverse(fy + a / 500.0), inverse(fy),
                              1.08883 * inverse(fy - b / 200.0)};
    const Eigen::Matrix3d to_linear{{3.2404542, -1.5371385, -0.4985314},
                                    {-0.9692660, 1.8760108, 0.0415560},
                                    {0.0556434, -0.2040259, 1.0572252}};
    const Eigen::Vector3d linear = to_linear * xyz;
    return {screen_value(linear.x()), screen_value(linear.y()), screen_value(linear.z())};
}

std::vector<Rgb> sequential_colours(int count) {
    std::vector<Rgb> colours;
    colours.reserve(static_cast<std::size_t>(std::max(count, 0)));
    for (int i = 0; i < count; ++i)
        colours.push_back(between(ramp_dark, ramp_light, count == 1 ? 0.5 : 1.0 * i / (count - 1)));
    return colours;
}

std::vector<Rgb> diverging_colours(int count) {
    std::vector<Rgb> colours;
    colours.reserve(static_cast<std::size_t>(std::max(count, 0)));
    for (int i = 0; i < count; ++i) {
        const double place = count == 1 ? 0.0 : 2.0 * i / (count - 1) - 1.0;
        colours.push_back(between(at_zero, place < 0.0 ? below_zero : above_zero, std::abs(place)));
    }
    return colours;
}

std::vector<Rgb> categorical_colours(int count) {
    constexpr std::array<Rgb, 8> palette{{{0, 114, 178},
                                          {230, 159, 0},
                                          {0, 158, 115},
                                          {204, 121, 167},
                                          {86, 180, 233},
                                          {213, 94, 0},
                                          {240, 228, 66},
                                          {0, 0, 0}}};
    std::vector<Rgb> colours;
    colours.reserve(static_cast<std::size_t>(std::max(count, 0)));
    for (int i = 0; i < count; ++i)
        colours.push_back(palette.at(static_cast<std::size_t>(i) % palette.size()));
    return colours;
}

std::vector<double> class_limits(std::vector<double> values, int count, bool diverging) {
    std::erase_if(values, [](double v) { return !std::isfinite(v); });
    if (values.empty())
        return {};
    std::sort(values.begin(), values.end());
    if (diverging)
        return diverging_limits(values, count);
    const double low = values.front(), high = values.back();
    // Steps finer than the numbers themselves would never reach the other end.
    if (high - low <= 1e-9 * std::max(std::abs(low), std::abs(high)))
        return {low, high};
    std::vector<double> limits = round_limits(low, high, count);
    return is_lopsided(values, limits) ? quantile_limits(values, count) : limits;
}

} // namespace rillstrand::geo

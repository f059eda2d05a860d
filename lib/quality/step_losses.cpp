// SPDX-License-Identifier: Apache-2.0
#include "quality/step_losses.hpp"

#include "base/text.hpp"
#include "quality/bath_means.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::quality {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr Eigen::Index hours_apart = 3, groups = 24 / hours_apart;
/// Kelvin per unit of the logarithm at 10 degC and gamma 482 K, for what people read.
constexpr double kelvin_per_log = 283.15 * 283.15 / 482.0;
/// A jump under 0.02 K is left alone whatever its significance.
constexpr double least_jump = 0.02 / kelvin_per_log;

/// Means of the logarithm at each channel, over all traces and by the hour of the day.
struct Means {
    Eigen::ArrayXXd by_hour; ///< row = channel
    Eigen::ArrayXd all;
    Eigen::ArrayXd sd; ///< of `all`, from the scatter within hours
};

Means mean_logarithms(const record::Source& source) {
    const record::Axes& axes = source.axes();
    const Eigen::Index n = axes.n_place(),
                       rows_at_once = std::max<Eigen::Index>(1, source.block_rows());
    const Eigen::Index columns = std::max<Eigen::Index>(1, source.block_columns());
    Means out{Eigen::ArrayXXd::Zero(n, groups), Eigen::ArrayXd(n), Eigen::ArrayXd(n)};
    Eigen::ArrayXXd count = Eigen::ArrayXXd::Zero(n, groups);
    // Shot noise of differences in time, so that the day's wave does not count as noise.
    Eigen::ArrayXd square = Eigen::ArrayXd::Zero(n), pairs = Eigen::ArrayXd::Zero(n);
    for (Eigen::Index j = 0; j < n; j += columns) {
        const Eigen::Index wide = std::min(columns, n - j);
        Eigen::ArrayXd last = Eigen::ArrayXd::Constant(wide, nan);
        for (Eigen::Index i = 0; i < axes.n_time(); i += rows_at_once) {
            const Eigen::Index rows = std::min(rows_at_once, axes.n_time() - i);
            Eigen::ArrayXXd value(rows, wide), variance(rows, wide);
            read_log_ratio(source, false, i, j, value, variance);
            for (Eigen::Index c = 0; c < wide; ++c)
                for (Eigen::Index r = 0; r < rows; ++r) {
                    const double v = value(r, c);
                    if (std::isnan(v))
                        continue;
                    const double hour = std::fmod(axes.time_s(i + r) / 3600.0, 24.0);
                    const auto g = std::clamp<Eigen::Index>(
                        static_cast<Eigen::Index>(hour / static_cast<double>(hours_apart)), 0,
                        groups - 1);
                    out.by_hour(j + c, g) += v;
                    count(j + c, g) += 1.0;
                    if (!std::isnan(last(c))) {
                        square(j + c) += (v - last(c)) * (v - last(c));
                        pairs(j + c) += 1.0;
                    }
                    last(c) = v;
                }
        }
    }
    const Eigen::ArrayXd n_all = count.rowwise().sum();
    out.all = out.by_hour.rowwise().sum() / n_all;
    out.sd = (0.5 * square / pairs / n_all).sqrt();
    out.by_hour = (count > 0.0).select(out.by_hour / count, nan);
    return out;
}

/// The step of a straight line at a place; its factor turns the sd of a channel into its own.
struct Jump {
    double size = nan, factor = nan;
};

class JumpFinder {
public:
    JumpFinder(const record::Axes& axes, double response_m)
        : m_axes{axes}, m_response_m{response_m} {
        const Eigen::Index n = axes.n_place();
        const double spacing_m =
            n > 1 ? (axes.distance_m(n - 1) - axes.distance_m(0)) / static_cast<double>(n - 1)
                  : 1.0;
        m_window_m = std::max(5.0 * response_m, 6.0 * spacing_m);
    }
    double reach_m() const { return m_window_m + m_response_m; }

    /// Jump between channels j and j + 1 of one row of means.
    template <class Values> Jump at(const Values& values, Eigen::Index j) const {
        const double at_m = 0.5 * (m_axes.distance_m(j) + m_axes.distance_m(j + 1));
        const auto range = record::places_between(m_axes, at_m - reach_m(), at_m + reach_m());
        // Least squares of a + b u + c side, side = -1/2 or 1/2.
        double n = 0, u1 = 0, u2 = 0, s1 = 0, s2 = 0, us = 0, y1 = 0, yu = 0, ys = 0, left = 0,
               right = 0;
        for (Eigen::Index k = range.first; k < range.first + range.count; ++k) {
            const double u = m_axes.distance_m(k) - at_m, y = values(k);
            if (std::abs(u) < m_response_m || std::isnan(y))
                continue;
            const double s = u > 0.0 ? 0.5 : -0.5;
            (u > 0.0 ? right : left) += 1.0;
            n += 1.0;
            u1 += u;
            u2 += u * u;
            s1 += s;
            s2 += s * s;
            us += u * s;
            y1 += y;
            yu += y * u;
            ys += y * s;
        }
        if (left < 4.0 || right < 4.0)
            return {};
        const double cuu = u2 - u1 * u1 / n, css = s2 - s1 * s1 / n, cus = us - u1 * s1 / n;
        const double cyu = yu - y1 * u1 / n, cys = ys - y1 * s1 / n;
        const double determinant = cuu * css - cus * cus;
        if (!(determinant > 1e-12 * cuu * css))
            return {};
        return {(cuu * cys - cus * cyu) / determinant, std::sqrt(cuu / determinant)};
    }

private:
    const record::Axes& m_axes;
    double m_response_m, m_window_m;
};

double median(std::vector<double> values) {
    if (values.empty())
        return nan;
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    return *middle;
}

/// Whether a jump stays the same while the water's temperature changes through the day.
enum class Sort { loss, water, untold };

Sort sort_of(const Means& means, const JumpFinder& finder, Eigen::Index j, double jump,
             double jump_sd) {
    double n = 0, x1 = 0, x2 = 0, y1 = 0, xy = 0, low = 1e300, high = -1e300;
    for (Eigen::Index g = 0; g < groups; ++g) {
        const Jump here = finder.at(means.by_hour.col(g), j);
        const double level = 0.5 * (means.by_hour(j, g) + means.by_hour(j + 1, g));
        if (std::isnan(here.size) || std::isnan(level))
            continue;
        n += 1.0;
        x1 += level;
        x2 += level * level;
        y1 += here.size;
        xy += level * here.size;
        low = std::min(low, level);
        high = std::max(high, level);
    }
    if (n < 4.0)
        return Sort::untold;
    const double spread = x2 - x1 * x1 / n, range = high - low;
    // The day's wave must move the level by far more than the jump's own doubt.
    if (!(range > 6.0 * jump_sd) || range < 0.2 / kelvin_per_log)
        return Sort::untold;
    const double slope = (xy - x1 * y1 / n) / spread;
    const double slope_sd = jump_sd * std::sqrt(n) / std::sqrt(spread);
    // An inflow's jump is f (T_in - T): over the day it changes by f times the range.
    return std::abs(slope) * range > 0.35 * std::abs(jump) + 2.0 * slope_sd * range ? Sort::water
                                                                                    : Sort::loss;
}

} // namespace

std::vector<StepLoss> find_step_losses(const record::Source& source,
                                       const std::vector<AdjustBath>& baths, double response_m,
                                       Warnings& warnings) {
    const record::Axes& axes = source.axes();
    const Means means = mean_logarithms(source);
    const JumpFinder finder{axes, response_m};
    const Eigen::Index n = axes.n_place();
    Eigen::ArrayXd jump = Eigen::ArrayXd::Constant(std::max<Eigen::Index>(1, n - 1), nan),
                   noise = jump;
    std::vector<double> sizes;
    for (Eigen::Index j = 0; j + 1 < n; ++j) {
        const double at_m = 0.5 * (axes.distance_m(j) + axes.distance_m(j + 1));
        bool near_bath = false;
        for (const auto& bath : baths) {
            const double from_m = axes.distance_m(bath.places.first),
                         to_m = axes.distance_m(bath.places.first + bath.places.count - 1);
            // The bath's own edges lie up to two responses beyond its inner channels.
            near_bath = near_bath || (at_m > from_m - finder.reach_m() - 3.0 * response_m &&
                                      at_m < to_m + finder.reach_m() + 3.0 * response_m);
        }
        if (near_bath)
            continue;
        const Jump here = finder.at(means.all, j);
        jump(j) = here.size;
        noise(j) = here.factor * means.sd(j);
        if (!std::isnan(here.size))
            sizes.push_back(std::abs(here.size));
    }
    const double usual = median(sizes) / 0.6745; // what the ground itself does from place to place
    std::vector<StepLoss> found;
    for (Eigen::Index j = 0; j + 1 < n; ++j) {
        const double size = std::abs(jump(j));
        if (!(size > std::max({6.0 * usual, 5.0 * noise(j), least_jump})))
            continue;
        const double at_m = 0.5 * (axes.distance_m(j) + axes.distance_m(j + 1));
        const auto around =
            record::places_between(axes, at_m - finder.reach_m(), at_m + finder.reach_m());
        bool greatest = true;
        for (Eigen::Index k = around.first; k < std::min(n - 1, around.first + around.count); ++k)
            greatest = greatest && !(std::abs(jump(k)) > size);
        if (!greatest)
            continue;
        const double sd = std::hypot(noise(j), usual);
        const Sort sort = sort_of(means, finder, j, jump(j), std::max(noise(j), 1e-9));
        const double apparent_K = -jump(j) * kelvin_per_log;
        if (sort == Sort::loss)
            found.push_back({at_m, jump(j), sd, apparent_K});
        if (sort == Sort::untold)
            warnings.push_back(
                {"adjust-step-untold",
                 "at " + text::fixed(at_m, 1) + " m the powers jump as by " +
                     text::fixed(apparent_K, 2) +
                     " K; the day's wave is too small to tell a loss from water, and "
                     "nothing was done"});
    }
    return found;
}

} // namespace rillstrand::quality

// SPDX-License-Identifier: Apache-2.0
#include "snow/snow.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::snow {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

struct Cover {
    Eigen::Index begin = -1, end = -1; ///< first day, and the day after the last
    int spells = 0;
};

/// The longest run of covered days; a gap of one day does not end it.
Cover longest_cover(const std::vector<bool>& covered) {
    Cover best;
    const auto n = static_cast<Eigen::Index>(covered.size());
    Eigen::Index begin = -1, last = -9;
    for (Eigen::Index d = 0; d < n; ++d) {
        if (!covered[static_cast<std::size_t>(d)])
            continue;
        if (d - last > 2) {
            begin = d;
            ++best.spells;
        }
        last = d;
        if (last + 1 - begin > best.end - best.begin) {
            best.begin = begin;
            best.end = last + 1;
        }
    }
    return best;
}

/// Sd of the day on which a cover ends: the probabilities around it, made to fall, are its
/// survival function. Half a day is added for the whole-day grid and the start of the day.
double end_sd_d(const Eigen::Ref<const Eigen::ArrayXd>& probability, Eigen::Index end) {
    const Eigen::Index from = std::max<Eigen::Index>(0, end - 20),
                       to = std::min(probability.size(), end + 20);
    double survives = 1.0, mean = 0.0, square = 0.0;
    for (Eigen::Index d = from; d < to; ++d) {
        double above = probability(d);
        if (d < end) // before the end a dip is cover that comes back
            above = std::max(above, probability.segment(d, end - d).maxCoeff());
        const double next = std::min(survives, above);
        const auto at = static_cast<double>(d - end);
        mean += (survives - next) * at;
        square += (survives - next) * at * at;
        survives = next;
    }
    const auto at = static_cast<double>(to - end);
    mean += survives * at;
    square += survives * at * at;
    return std::sqrt(std::max(0.0, square - mean * mean) + mean * mean + 0.25);
}

} // namespace

const char* to_string(State state) {
    switch (state) {
    case State::bare:
        return "bare";
    case State::snow:
        return "snow";
    case State::unknown:
        break;
    }
    return "unknown";
}

const char* to_string(Condition condition) {
    switch (condition) {
    case Condition::bare:
        return "bare";
    case Condition::quiet_bare:
        return "quiet bare";
    case Condition::dry_snow:
        return "dry snow";
    case Condition::melting_snow:
        return "melting snow";
    case Condition::unknown:
        break;
    }
    return "unknown";
}

SnowChannels find_channels(const Eigen::ArrayXd& fibre_m,
                           const Eigen::Array<State, Eigen::Dynamic, Eigen::Dynamic>& state,
                           const Eigen::ArrayXXd& probability) {
    const Eigen::Index n = probability.rows(), places = probability.cols();
    SnowChannels c;
    c.fibre_m = fibre_m;
    const auto size = static_cast<std::size_t>(places);
    c.cover_onset.assign(size, -1);
    c.melt_out.assign(size, -1);
    c.spells.assign(size, 0);
    c.melt_out_sd_d = Eigen::ArrayXd::Constant(places, nan);
    c.covered_days = c.covered_days_sd = c.mean_probability = Eigen::ArrayXd::Zero(places);
    std::vector<bool> covered(static_cast<std::size_t>(n));
    for (Eigen::Index j = 0; j < places; ++j) {
        for (Eigen::Index d = 0; d < n; ++d)
            covered[static_cast<std::size_t>(d)] =
                state(d, j) == State::snow ||
                (state(d, j) == State::unknown && probability(d, j) > 0.5);
        const auto k = static_cast<std::size_t>(j);
        const Cover cover = longest_cover(covered);
        c.spells[k] = cover.spells;
        c.covered_days(j) = static_cast<double>(std::count(covered.begin(), covered.end(), true));
        if (n > 0 && std::isnan(probability(0, j))) { // a channel without any sample
            c.covered_days(j) = c.covered_days_sd(j) = c.mean_probability(j) = nan;
            continue;
        }
        const Eigen::ArrayXd spread = probability.col(j) * (1.0 - probability.col(j));
        // Uncertain days come in spells, so their errors add rather than cancel.
        c.covered_days_sd(j) = std::sqrt(3.0 * spread.sum());
        c.mean_probability(j) = n > 0 ? probability.col(j).mean() : nan;
        if (cover.begin < 0)
            continue;
        c.cover_onset[k] = static_cast<int>(cover.begin);
        if (cover.end < n) {
            c.melt_out[k] = static_cast<int>(cover.end);
            c.melt_out_sd_d(j) = end_sd_d(probability.col(j), cover.end);
        }
    }
    return c;
}

SnowCover find_cover(const Days& days, const Eigen::ArrayXXd& probability,
                     const std::vector<Eigen::Index>& which) {
    constexpr double together = 0.12, least_sd = 0.004;
    const Eigen::Index n = probability.rows();
    SnowCover cover;
    cover.covered_fraction = cover.covered_fraction_sd = Eigen::ArrayXd::Constant(n, nan);
    for (Eigen::Index d = 0; d < n; ++d) {
        double sum = 0.0, spread = 0.0, channels = 0.0;
        bool seen = false;
        const auto add = [&](Eigen::Index j) {
            const double p = probability(d, j);
            if (std::isnan(p))
                return;
            sum += p;
            spread += p * (1.0 - p);
            channels += 1.0;
            seen = seen || std::isfinite(days.mean_degC(d, j));
        };
        if (which.empty())
            for (Eigen::Index j = 0; j < probability.cols(); ++j)
                add(j);
        else
            for (const Eigen::Index j : which)
                add(j);
        if (!seen || channels == 0.0)
            continue;
        cover.covered_fraction(d) = sum / channels;
        cover.covered_fraction_sd(d) =
            std::sqrt(spread / channels * (1.0 / channels + together * (1.0 - 1.0 / channels)) +
                      least_sd * least_sd);
    }
    return cover;
}

} // namespace rillstrand::snow

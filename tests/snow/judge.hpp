// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "hillside.hpp"
#include "snow/snow.hpp"

#include <array>
#include <cmath>

/// Findings against a hillside whose truth is known.
namespace rillstrand::hillside {

struct Score {
    double days = 0, right = 0, brier = 0;
    double grey = 0, grey_right = 0;
    double covers = 0, cover_square = 0, cover_inside = 0;
    double melts = 0, melts_near = 0, melts_inside = 0;
    std::array<double, 20> n{}, expected{}, seen{};

    double reliability() const {
        double sum = 0.0;
        for (std::size_t k = 0; k < n.size(); ++k)
            if (n[k] > 0.0)
                sum += n[k] * std::pow((expected[k] - seen[k]) / n[k], 2);
        return sum / days;
    }
};

inline snow::SnowInput input_of(const Hillside& h, const Setup& setup, bool with_air) {
    snow::SnowInput input;
    input.time_s = h.time_s;
    input.bin_s = h.interval_s;
    input.fibre_m = h.fibre_m;
    input.temperature_degC = h.temperature_degC;
    input.longitude_deg = setup.longitude_deg;
    input.burial_depth_m = setup.burial_depth_m;
    input.spatial_response_m = setup.response_m;
    input.config.stretch = "slope";
    if (with_air)
        input.air_degC = snow::Series{h.time_s, h.air_degC};
    return input;
}

/// Share of each day's hours with snow; NaN where the day is cut by the record's ends.
inline Eigen::ArrayXXd true_share(const Hillside& h, const snow::Days& days) {
    Eigen::ArrayXXd covered = Eigen::ArrayXXd::Zero(days.n_day(), h.fibre_m.size());
    Eigen::ArrayXd n = Eigen::ArrayXd::Zero(days.n_day());
    for (Eigen::Index i = 0; i < h.time_s.size(); ++i) {
        const auto d = static_cast<Eigen::Index>((h.time_s(i) - days.first_s(0)) / 86400.0);
        n(d) += 1.0;
        covered.row(d) += (h.depth_m.row(i) > static_cast<float>(covered_from_m)).cast<double>();
    }
    for (Eigen::Index d = 0; d < days.n_day(); ++d)
        covered.row(d) /= n(d) >= 12.0 ? n(d) : std::nan("");
    return covered;
}

inline void judge(const Hillside& h, const snow::SnowFindings& f, Score& score) {
    const Eigen::ArrayXXd truth = true_share(h, f.days);
    const Eigen::Index places = truth.cols();
    for (Eigen::Index d = 0; d < truth.rows(); ++d) {
        if (std::isnan(truth(d, 0)))
            continue;
        const double noon_s = f.days.first_s(d) + 43200.0;
        const bool grey = noon_s > h.grey_from_s && noon_s < h.grey_to_s;
        double covered = 0.0;
        for (Eigen::Index j = 0; j < places; ++j) {
            const bool snow = truth(d, j) > 0.5;
            const double p = f.probability(d, j), error = p - (snow ? 1.0 : 0.0);
            const bool right = (p > 0.5) == snow;
            covered += snow ? 1.0 : 0.0;
            score.days += 1.0;
            score.right += right ? 1.0 : 0.0;
            score.brier += error * error;
            score.grey += grey ? 1.0 : 0.0;
            score.grey_right += grey && right ? 1.0 : 0.0;
            const auto k = static_cast<std::size_t>(std::min(19.0, 20.0 * p));
            score.n[k] += 1.0;
            score.expected[k] += p;
            score.seen[k] += snow ? 1.0 : 0.0;
        }
        const double off = f.cover.covered_fraction(d) - covered / static_cast<double>(places);
        if (std::isnan(off))
            continue;
        score.covers += 1.0;
        score.cover_square += off * off;
        score.cover_inside += std::abs(off) <= 2.0 * f.cover.covered_fraction_sd(d) ? 1.0 : 0.0;
    }
    const snow::SnowChannels real = snow::find_channels(
        h.fibre_m,
        (truth > 0.5)
            .select(Eigen::Array<snow::State, Eigen::Dynamic, Eigen::Dynamic>::Constant(
                        truth.rows(), places, snow::State::snow),
                    Eigen::Array<snow::State, Eigen::Dynamic, Eigen::Dynamic>::Constant(
                        truth.rows(), places, snow::State::bare)),
        f.probability);
    for (std::size_t j = 0; j < real.melt_out.size(); ++j) {
        if (real.melt_out[j] < 0 || real.melt_out[j] - real.cover_onset[j] < 3)
            continue;
        const double off = f.channels.melt_out[j] - real.melt_out[j];
        const auto at = static_cast<Eigen::Index>(j);
        score.melts += 1.0;
        score.melts_near += f.channels.melt_out[j] >= 0 && std::abs(off) <= 1.0 ? 1.0 : 0.0;
        score.melts_inside += std::abs(off) <= 2.0 * f.channels.melt_out_sd_d(at) ? 1.0 : 0.0;
    }
}

} // namespace rillstrand::hillside

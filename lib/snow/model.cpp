// SPDX-License-Identifier: Apache-2.0
#include "snow/model.hpp"

#include "stats/hidden_markov.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <vector>

namespace rillstrand::snow {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr Eigen::Index n_level = 6;
/// Swing of bare ground at each level over that of the clearest days, and how often it comes.
constexpr std::array<double, 6> level_share{0.03, 0.065, 0.14, 0.3, 0.6, 1.1};
constexpr std::array<double, 6> level_prior{0.04, 0.09, 0.19, 0.28, 0.26, 0.14};
/// Day-to-day change of bare ground's mean at each level, K.
constexpr std::array<double, 6> level_change_K{0.6, 0.7, 0.9, 1.2, 1.5, 1.8};

struct Tuning {
    double swing_weight = 0.8, mean_weight = 0.6, blind_mean_weight = 0.35;
    double onset = 0.02, melt = 0.025;
    double rate_strength = 3.0; ///< channel-days that the usual rates weigh
    double shared_channels = 6.0;
    double coupling = 0.1;
    double final_temper = 0.85;
    double bare_spread = 0.5, snow_spread = 0.5;
    double trust_least = 0.2, change_floor = 0.7;
};
constexpr Tuning tuning;

/// Logarithm of Student's t density with 4 degrees of freedom.
double log_t(double x, double scale) {
    const double u = x / scale;
    return -std::log(scale) - 0.981 - 2.5 * std::log1p(0.25 * u * u);
}

double log_sum(double a, double b) {
    const double top = std::max(a, b);
    return top + std::log(std::exp(a - top) + std::exp(b - top));
}

double median(std::vector<double> values, double otherwise) {
    if (values.empty())
        return otherwise;
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    return *middle;
}

double high_quantile(std::vector<double> values, double share) {
    if (values.empty())
        return nan;
    const auto at = values.begin() +
                    static_cast<std::ptrdiff_t>(share * static_cast<double>(values.size() - 1));
    std::nth_element(values.begin(), at, values.end());
    return *at;
}

struct Channel {
    double log_bare = -0.4, log_bare_sd = 0.5; ///< share of the forcing when bare
    double log_snow = -3.0, log_snow_sd = 0.9; ///< under snow
    double change_K = 0.15;                    ///< day-to-day change under snow
    double stands_degC = -0.3, stands_sd_K = 0.9;
    double floor_K = 0.05;                      ///< swing that noise alone can make
    std::array<Eigen::Index, 2> beside{-1, -1}; ///< channels whose heat the response lets in
    std::vector<std::pair<Eigen::Index, double>> neighbours;
};

class Model {
public:
    Model(const Days& days, const ModelInput& input)
        : m_days{days}, m_input{input}, m_n{days.n_day()}, m_places{days.mean_degC.cols()} {
        m_channels.resize(static_cast<std::size_t>(m_places));
        m_bare = Eigen::ArrayXXd::Constant(m_n, m_places, 0.5);
        m_change = Eigen::ArrayXXd::Constant(m_n, m_places, nan);
        for (Eigen::Index j = 0; j < m_places; ++j)
            for (Eigen::Index d = 1; d < m_n; ++d)
                m_change(d, j) = days.mean_degC(d, j) - days.mean_degC(d - 1, j);
        m_damping = std::exp(-input.burial_depth_m / 0.12);
        m_slow_damping = std::exp(-input.burial_depth_m / 0.35);
        find_floors();
        find_beside();
        find_clearest();
        find_zero();
        make_levels();
        m_shared = Eigen::ArrayXXd::Zero(m_n, n_level);
        m_onset = Eigen::ArrayXd::Constant(m_n, tuning.onset);
        m_melt = Eigen::ArrayXd::Constant(m_n, tuning.melt);
        m_onset_sum = m_melt_sum = Eigen::ArrayXd::Zero(m_n);
        m_own_level.resize(static_cast<std::size_t>(m_places));
    }

    ModelResult run() {
        constexpr int rounds = 9;
        for (int round = 0; round < rounds; ++round) {
            m_round = round;
            sweep();
            learn_channels();
            learn_shared();
            learn_leak();
            if (round >= 3)
                learn_neighbours();
        }
        return result();
    }

private:
    const Days& m_days;
    const ModelInput& m_input;
    Eigen::Index m_n, m_places;
    std::vector<Channel> m_channels;
    Eigen::ArrayXXd m_bare;   ///< P(bare)
    Eigen::ArrayXXd m_change; ///< of the daily mean from the day before
    Eigen::ArrayXXd m_shared; ///< sum over channels of what their swings say of the level
    Eigen::ArrayXXd m_air_level;
    std::vector<Eigen::ArrayXXd> m_own_level; ///< each channel's part of m_shared
    Eigen::ArrayXd m_shared_weight;
    Eigen::ArrayXXd m_level_posterior; ///< row = day, mean over channels
    Eigen::ArrayXd m_ground_sum, m_ground_weight, m_change_sum, m_change_weight;
    Eigen::ArrayXd m_onset, m_melt, m_onset_sum, m_melt_sum, m_bare_before, m_snow_before;
    Eigen::ArrayXd m_air_slow;
    Eigen::MatrixXd m_level_step;
    double m_damping = 1.0, m_slow_damping = 1.0, m_clearest_K = 10.0, m_zero_K = 0.0;
    double m_air_slope = 0.5, m_leak = 0.15;
    int m_round = 0;

    /// Sum over the neighbours that the response lets in.
    double beside(const Eigen::ArrayXXd& values, Eigen::Index d, const Channel& c) const {
        double sum = 0.0;
        for (const Eigen::Index k : c.beside)
            if (k >= 0 && std::isfinite(values(d, k)))
                sum += m_bare(d, k) * values(d, k);
        return sum;
    }
    double beside_over(Eigen::Index d, const Channel& c, double cap) const {
        double sum = 0.0;
        for (const Eigen::Index k : c.beside)
            if (k >= 0 && m_days.max_degC(d, k) > cap)
                sum += m_bare(d, k) * (m_days.max_degC(d, k) - cap);
        return sum;
    }
    double beside_change(Eigen::Index d, const Channel& c) const {
        double sum = 0.0;
        for (const Eigen::Index k : c.beside)
            if (k >= 0 && std::isfinite(m_change(d, k)))
                sum += m_bare(d, k) * std::abs(m_change(d, k));
        return sum;
    }

    /// Neighbours nearer than the response, or at least nearer than 3 m.
    void find_beside() {
        const double reach_m = std::max(3.0, 1.5 * m_input.spatial_response_m);
        for (Eigen::Index j = 0; j + 1 < m_places; ++j)
            if (m_input.fibre_m(j + 1) - m_input.fibre_m(j) <= reach_m) {
                m_channels[static_cast<std::size_t>(j)].beside[1] = j + 1;
                m_channels[static_cast<std::size_t>(j + 1)].beside[0] = j;
            }
    }

    /// Share of the neighbours' swing that shows in a channel under snow: from edges of the cover.
    void learn_leak() {
        std::vector<double> ratio;
        for (Eigen::Index j = 0; j < m_places; ++j) {
            const Channel& c = m_channels[static_cast<std::size_t>(j)];
            for (Eigen::Index d = 0; d < m_n; ++d) {
                if (m_bare(d, j) > 0.2 || !std::isfinite(m_days.calm_swing_K(d, j)))
                    continue;
                bool edge = false;
                for (const Eigen::Index k : c.beside)
                    edge = edge || (k >= 0 && m_bare(d, k) > 0.8);
                const double sum = beside(m_days.calm_swing_K, d, c);
                if (edge && sum > 20.0 * c.floor_K)
                    ratio.push_back(m_days.calm_swing_K(d, j) / sum);
            }
        }
        const auto n = static_cast<double>(ratio.size());
        m_leak = std::clamp((n * median(ratio, 0.1) + 20.0 * 0.15) / (n + 20.0), 0.02, 0.42);
    }

    bool has_air() const { return m_input.air_mean_degC.size() == m_n; }

    void find_floors() {
        for (Eigen::Index j = 0; j < m_places; ++j) {
            const double noise = m_days.noise_K(j);
            const double half = std::max(3.0, 0.5 * m_days.bins_a_day);
            m_channels[static_cast<std::size_t>(j)].floor_K =
                std::sqrt(8.0 * noise * noise * std::sqrt(2.0 / (half - 1.0)) + 0.04 * 0.04);
        }
    }

    /// Swing of open bare ground on the clearest days: what the record shows at most, within what
    /// sun and sky can do (3 to 30 K at the surface).
    void find_clearest() {
        std::vector<double> swings;
        for (Eigen::Index j = 0; j < m_places; ++j)
            for (Eigen::Index d = 0; d < m_n; ++d)
                if (std::isfinite(m_days.calm_swing_K(d, j)))
                    swings.push_back(m_days.calm_swing_K(d, j));
        const double seen = high_quantile(swings, 0.96);
        m_clearest_K =
            std::clamp(std::isfinite(seen) ? seen : 10.0, 3.0 * m_damping, 30.0 * m_damping);
    }

    /// Where melting snow holds the record: an instrument that reads high is noticed by the place
    /// where quiet days crowd above 0 degC.
    void find_zero() {
        m_zero_K = m_input.zero_offset_K;
        if (m_input.burial_depth_m > 0.01)
            return;
        std::array<double, 40> count{};
        double quiet = 0.0;
        for (Eigen::Index j = 0; j < m_places; ++j)
            for (Eigen::Index d = 0; d < m_n; ++d) {
                const double at = m_days.calm_mean_degC(d, j) - m_zero_K;
                if (m_days.calm_swing_K(d, j) <
                        2.0 * m_channels[static_cast<std::size_t>(j)].floor_K &&
                    std::abs(at) < 1.0) {
                    count[static_cast<std::size_t>((at + 1.0) * 19.99)] += 1.0;
                    quiet += 1.0;
                }
            }
        const auto most = std::max_element(count.begin(), count.end());
        if (quiet < 10.0 || *most < 0.2 * quiet)
            return;
        const double at = (static_cast<double>(most - count.begin()) + 0.5) / 20.0 - 1.0;
        m_zero_K += std::max(0.0, at);
    }

    void make_levels() {
        m_level_step.resize(n_level, n_level);
        for (Eigen::Index i = 0; i < n_level; ++i) {
            for (Eigen::Index k = 0; k < n_level; ++k) {
                const auto apart = static_cast<double>(i - k);
                m_level_step(i, k) = level_prior[static_cast<std::size_t>(k)] *
                                     (1.0 + 3.0 * std::exp(-0.5 * apart * apart));
            }
            m_level_step.row(i) /= m_level_step.row(i).sum();
        }
        m_air_level = Eigen::ArrayXXd::Zero(m_n, n_level);
        if (!has_air())
            return;
        std::vector<double> swings;
        for (const double swing : m_input.air_swing_K)
            if (std::isfinite(swing))
                swings.push_back(swing);
        const double clear_air_K = std::max(4.0, high_quantile(swings, 0.9));
        m_air_slow = m_input.air_mean_degC;
        for (Eigen::Index d = 1; d < m_n; ++d)
            if (std::isfinite(m_air_slow(d)) && std::isfinite(m_air_slow(d - 1)))
                m_air_slow(d) = 0.5 * m_air_slow(d) + 0.5 * m_air_slow(d - 1);
        for (Eigen::Index d = 0; d < m_n; ++d)
            for (Eigen::Index l = 0; l < n_level; ++l)
                if (std::isfinite(m_input.air_swing_K(d)))
                    m_air_level(d, l) =
                        0.7 *
                        log_t(std::log(std::max(0.3, m_input.air_swing_K(d)) /
                                       (clear_air_K *
                                        std::pow(level_share[static_cast<std::size_t>(l)], 0.6))),
                              0.5);
    }

    double log_swing(double y, double expected_K, double floor_K, double spread) const {
        const double e2 = expected_K * expected_K, f2 = floor_K * floor_K;
        const double seen = e2 / (e2 + f2);
        return log_t(y - 0.5 * std::log(e2 + f2), std::hypot(0.3, seen * spread));
    }

    /// What other channels' bare ground did that day: mean, change from the day before, weights.
    struct Ground {
        double mean_degC = nan, change_K = nan, mean_weight = 0.0, change_weight = 0.0;
    };
    Ground ground(Eigen::Index d, Eigen::Index j) const {
        Ground g;
        if (m_ground_sum.size() == 0)
            return g;
        const double own = m_bare(d, j);
        double sum = m_ground_sum(d), weight = m_ground_weight(d);
        if (std::isfinite(m_days.mean_degC(d, j))) {
            sum -= own * m_days.mean_degC(d, j);
            weight -= own;
        }
        if (weight > 0.5) {
            g.mean_degC = sum / weight;
            g.mean_weight = weight;
        }
        double change = m_change_sum(d), change_weight = m_change_weight(d);
        if (std::isfinite(m_change(d, j))) {
            const double both = own * m_bare(d - 1, j);
            change -= both * m_change(d, j);
            change_weight -= both;
        }
        if (change_weight > 0.5) {
            g.change_K = change / change_weight;
            g.change_weight = change_weight;
        }
        return g;
    }

    /// What others' bare ground is worth as a reference: less on days on which its swing does not
    /// show that it is bare.
    double ground_trust(Eigen::Index d) const {
        if (m_level_posterior.rows() == 0)
            return 1.0;
        const double shown = m_level_posterior.row(d).tail(3).sum();
        return tuning.trust_least + (1.0 - tuning.trust_least) * shown;
    }

    /// Log densities of the day's means under bare ground (per level) and under snow.
    void add_means(Eigen::Index d, Eigen::Index j, Eigen::Ref<Eigen::ArrayXd> bare,
                   double& snow) const {
        const Channel& c = m_channels[static_cast<std::size_t>(j)];
        const double mean = m_days.mean_degC(d, j), change = m_change(d, j);
        const double calm = m_days.calm_mean_degC(d, j);
        const Ground g = ground(d, j);
        double weight = tuning.blind_mean_weight;
        if (std::isfinite(g.mean_degC)) {
            weight = tuning.mean_weight * ground_trust(d);
            const double trust = std::min(1.0, g.mean_weight / 3.0);
            double level = log_t(mean - g.mean_degC, 2.0 + 3.0 * (1.0 - trust));
            if (std::isfinite(change) && std::isfinite(g.change_K))
                level = log_sum(level, log_t(change - g.change_K, tuning.change_floor +
                                                                      0.25 * std::abs(g.change_K) +
                                                                      (1.0 - trust))) -
                        std::log(2.0);
            bare.setConstant(level);
        } else if (has_air() && std::isfinite(m_air_slow(d))) {
            weight = 0.7 * tuning.mean_weight;
            double level = log_t(mean - m_air_slow(d) - 1.5, 3.0);
            const double moved =
                d > 0 ? m_input.air_mean_degC(d) - m_input.air_mean_degC(d - 1) : nan;
            if (std::isfinite(change) && std::isfinite(moved))
                level = log_sum(level, log_t(change - m_air_slope * m_slow_damping * moved,
                                             0.6 + 0.2 * std::abs(moved))) -
                        std::log(2.0);
            bare.setConstant(level);
        } else if (std::isfinite(change)) {
            for (Eigen::Index l = 0; l < n_level; ++l)
                bare(l) =
                    log_t(change, m_slow_damping * level_change_K[static_cast<std::size_t>(l)]);
        } else {
            return;
        }
        double level = log_t(calm - c.stands_degC, c.stands_sd_K);
        if (std::isfinite(change))
            level = log_sum(level, log_t(calm - m_days.mean_degC(d - 1, j),
                                         std::hypot(c.change_K, m_leak * beside_change(d, c)))) -
                    std::log(2.0);
        // Two standard deviations of the calm half against one day's mean: never more certain
        // than five times in a day.
        bare *= weight;
        snow += weight * level;
    }

    /// Ground under snow is not warmer than melting snow, but for depth and reading.
    double over_cap(Eigen::Index d, Eigen::Index j) const {
        const double depth = m_input.burial_depth_m;
        const double cap = m_zero_K + 0.3 + 28.0 * std::min(depth, 0.15);
        const double sd = std::hypot(0.3 + 14.0 * std::min(depth, 0.15), m_days.noise_K(j));
        const double warm = m_leak * beside_over(d, m_channels[static_cast<std::size_t>(j)], cap);
        const double over =
            std::max(0.0, m_days.calm_max_degC(d, j) - m_days.noise_K(j) - cap - warm) /
            std::hypot(sd, 0.4 * warm);
        return std::min(9.0, 0.5 * over * over);
    }

    Eigen::ArrayXXd emissions(Eigen::Index j) {
        const Channel& c = m_channels[static_cast<std::size_t>(j)];
        Eigen::ArrayXXd log_p = Eigen::ArrayXXd::Zero(m_n, 2 * n_level);
        Eigen::ArrayXXd& own = m_own_level[static_cast<std::size_t>(j)];
        Eigen::ArrayXXd cavity = m_shared;
        if (own.size() > 0)
            cavity -= own;
        Eigen::ArrayXXd next_own = Eigen::ArrayXXd::Zero(m_n, n_level);
        const double share = std::exp(c.log_bare), snow_share = std::exp(c.log_snow);
        const double bare_spread = std::hypot(tuning.bare_spread, c.log_bare_sd);
        const double snow_spread = std::hypot(tuning.snow_spread, c.log_snow_sd);
        for (Eigen::Index d = 0; d < m_n; ++d) {
            Eigen::ArrayXd bare = Eigen::ArrayXd::Zero(n_level), means = bare;
            Eigen::ArrayXd snow = Eigen::ArrayXd::Zero(n_level);
            const double swing = m_days.calm_swing_K(d, j);
            if (std::isfinite(swing)) {
                const double y = 0.5 * std::log(swing * swing + c.floor_K * c.floor_K);
                const double let_in = m_leak * beside(m_days.calm_swing_K, d, c);
                for (Eigen::Index l = 0; l < n_level; ++l) {
                    const double forcing = m_clearest_K * level_share[static_cast<std::size_t>(l)];
                    bare(l) =
                        tuning.swing_weight * log_swing(y, forcing * share, c.floor_K, bare_spread);
                    snow(l) =
                        tuning.swing_weight * log_swing(y, std::hypot(forcing * snow_share, let_in),
                                                        c.floor_K, snow_spread);
                }
                // What the swing says of the level, whichever state the channel was in.
                const double p = std::clamp(m_bare(d, j), 0.02, 0.98);
                for (Eigen::Index l = 0; l < n_level; ++l)
                    next_own(d, l) = log_sum(std::log(p) + bare(l), std::log(1.0 - p) + snow(l));
                double snow_mean = (m_round < 4 ? m_input.lean : 0.0) - over_cap(d, j);
                add_means(d, j, means, snow_mean);
                bare += means;
                snow += snow_mean;
            }
            double pull = 0.0;
            for (const auto& [k, w] : c.neighbours)
                pull += w * (1.0 - 2.0 * m_bare(d, k));
            const double weight = m_shared_weight.size() > 0 ? m_shared_weight(d) : 0.0;
            for (Eigen::Index l = 0; l < n_level; ++l) {
                const double level = weight * cavity(d, l) + m_air_level(d, l);
                log_p(d, l) = bare(l) + level - 0.5 * pull;
                log_p(d, n_level + l) = snow(l) + level + 0.5 * pull;
            }
        }
        own = next_own;
        return log_p;
    }

    void sweep() {
        Eigen::ArrayXXd p_bare(m_n, m_places);
        Eigen::ArrayXXd levels = Eigen::ArrayXXd::Zero(m_n, n_level);
        Eigen::ArrayXd onset = Eigen::ArrayXd::Zero(m_n), melt = onset, from_bare = onset,
                       from_snow = onset;
        Eigen::MatrixXd step(2 * n_level, 2 * n_level);
        stats::HiddenMarkov chain;
        chain.start.resize(2 * n_level);
        for (Eigen::Index l = 0; l < n_level; ++l)
            chain.start(l) = chain.start(n_level + l) =
                0.5 * level_prior[static_cast<std::size_t>(l)];
        chain.transition = [&](Eigen::Index t) -> const Eigen::MatrixXd& {
            const double on = m_onset(t + 1), off = m_melt(t + 1);
            step.topLeftCorner(n_level, n_level) = (1.0 - on) * m_level_step;
            step.topRightCorner(n_level, n_level) = on * m_level_step;
            step.bottomLeftCorner(n_level, n_level) = off * m_level_step;
            step.bottomRightCorner(n_level, n_level) = (1.0 - off) * m_level_step;
            return step;
        };
        for (Eigen::Index j = 0; j < m_places; ++j) {
            chain.log_emission = emissions(j);
            const stats::Smoothed s = stats::smooth(chain);
            p_bare.col(j) = s.probability.leftCols(n_level).rowwise().sum();
            levels += s.probability.leftCols(n_level) + s.probability.rightCols(n_level);
            for (Eigen::Index d = 1; d < m_n; ++d) {
                const Eigen::MatrixXd& pair = s.pair[static_cast<std::size_t>(d - 1)];
                onset(d) += pair.topRightCorner(n_level, n_level).sum();
                melt(d) += pair.bottomLeftCorner(n_level, n_level).sum();
                from_bare(d) += p_bare(d - 1, j);
                from_snow(d) += 1.0 - p_bare(d - 1, j);
            }
        }
        m_level_posterior = levels / static_cast<double>(m_places);
        m_bare = p_bare;
        // Channels see the same weather: together they weigh no more than a few.
        const double few = std::min(1.0, tuning.shared_channels / static_cast<double>(m_places));
        const double strength = tuning.rate_strength;
        m_onset =
            ((few * onset + strength * tuning.onset) / (few * from_bare + strength)).cwiseMin(0.5);
        m_melt =
            ((few * melt + strength * tuning.melt) / (few * from_snow + strength)).cwiseMin(0.5);
    }

    void learn_channels() {
        Eigen::ArrayXd log_forcing(m_n);
        for (Eigen::Index d = 0; d < m_n; ++d) {
            double sum = 0.0;
            for (Eigen::Index l = 0; l < n_level; ++l)
                sum += m_level_posterior(d, l) * std::log(level_share[static_cast<std::size_t>(l)]);
            log_forcing(d) = std::log(m_clearest_K) + sum;
        }
        for (Eigen::Index j = 0; j < m_places; ++j) {
            Channel& c = m_channels[static_cast<std::size_t>(j)];
            // Prior: shade takes half or so; snow leaves a twentieth, give or take a factor 2.5.
            double bare_sum = -0.4 / 0.25, bare_weight = 1.0 / 0.25;
            double snow_sum = -3.0 / 0.8, snow_weight = 1.0 / 0.8;
            double stands_sum = -0.3 * 6.0, stands_n = 6.0, stands2 = 0.0;
            std::vector<double> changes;
            for (Eigen::Index d = 0; d < m_n; ++d) {
                const double swing = m_days.calm_swing_K(d, j);
                if (!std::isfinite(swing))
                    continue;
                const double bare = m_bare(d, j), snow = 1.0 - bare;
                if (swing > 1.5 * c.floor_K) {
                    bare_sum += 0.7 * bare * (std::log(swing) - log_forcing(d));
                    bare_weight += 0.7 * bare;
                }
                if (log_forcing(d) > std::log(4.0 * c.floor_K)) {
                    const double ratio =
                        0.5 * std::log(swing * swing + 0.25 * c.floor_K * c.floor_K) -
                        log_forcing(d);
                    snow_sum += 0.4 * snow * ratio;
                    snow_weight += 0.4 * snow;
                }
                stands_sum += snow * m_days.calm_mean_degC(d, j);
                stands_n += snow;
                if (snow > 0.5 && std::isfinite(m_change(d, j)))
                    changes.push_back(std::abs(m_change(d, j)));
            }
            c.log_bare = std::clamp(bare_sum / bare_weight, -2.0, 0.4);
            c.log_bare_sd = std::clamp(1.0 / std::sqrt(0.3 * bare_weight), 0.1, 0.5);
            c.log_snow = std::clamp(snow_sum / snow_weight, -5.0, c.log_bare - 1.0);
            c.log_snow_sd = std::clamp(1.0 / std::sqrt(0.5 * snow_weight), 0.2, 0.9);
            c.stands_degC = stands_sum / stands_n;
            for (Eigen::Index d = 0; d < m_n; ++d)
                if (std::isfinite(m_days.calm_mean_degC(d, j)))
                    stands2 += (1.0 - m_bare(d, j)) *
                               std::pow(m_days.calm_mean_degC(d, j) - c.stands_degC, 2);
            c.stands_sd_K = std::clamp(std::sqrt((stands2 + 6.0 * 0.8) / stands_n), 0.4, 2.5);
            const auto n = static_cast<double>(changes.size());
            c.change_K =
                std::clamp((n * 1.5 * median(changes, 0.1) + 10.0 * 0.15) / (n + 10.0), 0.08, 0.7);
        }
    }

    void learn_shared() {
        m_shared.setZero();
        Eigen::ArrayXd informed = Eigen::ArrayXd::Zero(m_n);
        m_ground_sum = m_ground_weight = m_change_sum = m_change_weight = Eigen::ArrayXd::Zero(m_n);
        for (Eigen::Index j = 0; j < m_places; ++j) {
            m_shared += m_own_level[static_cast<std::size_t>(j)];
            for (Eigen::Index d = 0; d < m_n; ++d) {
                const double mean = m_days.mean_degC(d, j);
                if (!std::isfinite(mean))
                    continue;
                informed(d) += 1.0;
                m_ground_sum(d) += m_bare(d, j) * mean;
                m_ground_weight(d) += m_bare(d, j);
                if (std::isfinite(m_change(d, j))) {
                    const double both = m_bare(d, j) * m_bare(d - 1, j);
                    m_change_sum(d) += both * m_change(d, j);
                    m_change_weight(d) += both;
                }
            }
        }
        m_shared_weight = m_input.message_channels / informed.cwiseMax(m_input.message_channels);
    }

    /// Neighbours agree as often as the record shows, and never across an edge that it shows.
    void learn_neighbours() {
        const Eigen::ArrayXd snow_share = 1.0 - m_bare.rowwise().mean();
        for (Eigen::Index j = 0; j < m_places; ++j)
            m_channels[static_cast<std::size_t>(j)].neighbours.clear();
        for (Eigen::Index j = 0; j + 1 < m_places; ++j) {
            const double apart_m = m_input.fibre_m(j + 1) - m_input.fibre_m(j);
            if (apart_m > 5.0)
                continue;
            double differ = 1.0, n = 4.0; // a quarter, unless days of partial cover say else
            for (Eigen::Index d = 0; d < m_n; ++d)
                if (snow_share(d) > 0.03 && snow_share(d) < 0.97) {
                    differ += std::abs(m_bare(d, j) - m_bare(d, j + 1));
                    n += 1.0;
                }
            const double agree = std::clamp(1.0 - differ / n, 0.5, 0.97);
            const double w =
                tuning.coupling * std::log(agree / (1.0 - agree)) * std::exp(-apart_m / 5.0);
            m_channels[static_cast<std::size_t>(j)].neighbours.emplace_back(j + 1, w);
            m_channels[static_cast<std::size_t>(j + 1)].neighbours.emplace_back(j, w);
        }
    }

    ModelResult result() const {
        ModelResult r;
        const auto squeeze = [](double bare) {
            const double p = std::clamp(1.0 - bare, 1e-6, 1.0 - 1e-6);
            const double odds = tuning.final_temper * std::log(p / (1.0 - p));
            return 0.002 + 0.996 / (1.0 + std::exp(-odds));
        };
        r.probability = m_bare.unaryExpr(squeeze);
        r.forcing_K.resize(m_n);
        r.forcing_log_sd.resize(m_n);
        r.forcing_known.resize(m_n);
        for (Eigen::Index d = 0; d < m_n; ++d) {
            double mean = 0.0, square = 0.0;
            for (Eigen::Index l = 0; l < n_level; ++l) {
                const double x = std::log(level_share[static_cast<std::size_t>(l)]);
                mean += m_level_posterior(d, l) * x;
                square += m_level_posterior(d, l) * x * x;
            }
            r.forcing_K(d) = m_clearest_K * std::exp(mean);
            r.forcing_log_sd(d) = std::sqrt(std::max(0.0, square - mean * mean) + 0.09);
            r.forcing_known(d) = std::min(1.0, m_ground_weight(d) / 2.0);
        }
        r.bare_share.resize(m_places);
        r.snow_share.resize(m_places);
        r.under_snow_degC.resize(m_places);
        for (Eigen::Index j = 0; j < m_places; ++j) {
            const Channel& c = m_channels[static_cast<std::size_t>(j)];
            r.bare_share(j) = std::exp(c.log_bare);
            r.snow_share(j) = std::exp(c.log_snow);
            r.under_snow_degC(j) = c.stands_degC;
        }
        return r;
    }
};

} // namespace

ModelResult run_model(const Days& days, const ModelInput& input) {
    if (days.n_day() == 0 || days.mean_degC.cols() == 0)
        return {};
    return Model{days, input}.run();
}

} // namespace rillstrand::snow

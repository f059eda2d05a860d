// SPDX-License-Identifier: Apache-2.0
#include "stream/frame.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double mad_to_sd = 1.482602; // normal distribution

void check_sizes(const StreamInput& input) {
    const std::string where = "stretch '" + input.config.stretch + "': ";
    if (input.temperature_degC.rows() != input.time_s.size() ||
        input.temperature_degC.cols() != input.fibre_m.size())
        throw DataError(where + "the matrix of temperatures does not fit its axes; this is a fault "
                                "of the program, please report it");
    for (Eigen::Index j = 1; j < input.fibre_m.size(); ++j)
        if (!(input.fibre_m[j] > input.fibre_m[j - 1]))
            throw DataError(where + "fibre distances do not increase at " +
                            text::number(input.fibre_m[j]) + " m; sort the channels");
}

bool is_excluded(const StreamInput& input, double fibre_m) {
    return std::any_of(input.excluded.begin(), input.excluded.end(), [&](const Exclusion& e) {
        return fibre_m >= e.from_m - 1e-6 && fibre_m <= e.to_m + 1e-6;
    });
}

/// Sample sd of second differences in time of one channel, in units of one value's noise.
double rough_noise(const Eigen::ArrayXXd& all, Eigen::Index j) {
    std::vector<double> d;
    d.reserve(static_cast<std::size_t>(all.rows()));
    for (Eigen::Index i = 1; i + 1 < all.rows(); ++i) {
        const double x = all(i - 1, j) - 2.0 * all(i, j) + all(i + 1, j);
        if (std::isfinite(x))
            d.push_back(std::abs(x));
    }
    return d.empty() ? nan : mad_to_sd * median(std::move(d)) / std::sqrt(6.0);
}

void drop(Frame& frame, double fibre_m, const std::string& reason) {
    if (!frame.dropped.empty() && frame.dropped.back().reason == reason &&
        fibre_m - frame.dropped.back().to_m < 5.0)
        frame.dropped.back().to_m = fibre_m;
    else
        frame.dropped.push_back({fibre_m, fibre_m, reason});
}

std::vector<Eigen::Index> usable_channels(const StreamInput& input, Frame& frame) {
    const Eigen::ArrayXXd& all = input.temperature_degC;
    Eigen::Index rows = 0;
    for (Eigen::Index i = 0; i < all.rows(); ++i)
        rows += all.row(i).isFinite().any() ? 1 : 0;
    std::vector<Eigen::Index> some;
    std::vector<double> noise;
    for (Eigen::Index j = 0; j < all.cols(); ++j) {
        if (is_excluded(input, input.fibre_m[j]))
            continue;
        if (all.col(j).isFinite().count() * 10 < rows * 6) {
            drop(frame, input.fibre_m[j], "mostly missing");
            continue;
        }
        some.push_back(j);
        noise.push_back(rough_noise(all, j));
    }
    const double usual = median(noise);
    std::vector<Eigen::Index> good;
    for (std::size_t k = 0; k < some.size(); ++k) {
        if (!std::isfinite(noise[k]) || noise[k] > 6.0 * usual + 0.05)
            drop(frame, input.fibre_m[some[k]], "far noisier than the rest");
        else if (noise[k] == 0.0 && usual > 0.0)
            drop(frame, input.fibre_m[some[k]], "does not change with time");
        else
            good.push_back(some[k]);
    }
    return good;
}

std::vector<Eigen::Index> usable_times(const Eigen::ArrayXXd& all,
                                       const std::vector<Eigen::Index>& channels) {
    std::vector<Eigen::Index> rows;
    for (Eigen::Index i = 0; i < all.rows(); ++i) {
        std::size_t n = 0;
        for (const Eigen::Index j : channels)
            n += std::isfinite(all(i, j)) ? 1U : 0U;
        if (n * 10 >= channels.size() * 7 && n > 0)
            rows.push_back(i);
    }
    return rows;
}

/// Holes take the straight line between the nearest channels that have a value at that time.
Eigen::Index fill_holes(const Eigen::ArrayXd& place_m, Eigen::ArrayXXd& water) {
    Eigen::Index filled = 0;
    for (Eigen::Index i = 0; i < water.rows(); ++i)
        for (Eigen::Index j = 0; j < water.cols(); ++j) {
            if (std::isfinite(water(i, j)))
                continue;
            Eigen::Index right = j;
            while (right < water.cols() && !std::isfinite(water(i, right)))
                ++right;
            const Eigen::Index left = j - 1; // filled already, or none
            for (Eigen::Index k = j; k < right; ++k, ++filled) {
                if (left < 0)
                    water(i, k) = water(i, right);
                else if (right == water.cols())
                    water(i, k) = water(i, left);
                else
                    water(i, k) = water(i, left) + (water(i, right) - water(i, left)) *
                                                       (place_m[k] - place_m[left]) /
                                                       (place_m[right] - place_m[left]);
            }
        }
    return filled;
}

/// Second differences in time of each channel against two others beyond the spatial response.
Eigen::ArrayXXd fast_part(const Frame& frame, Eigen::Index apart) {
    const Eigen::Index n = frame.n_place();
    Eigen::ArrayXXd out(frame.n_time() - 2, n);
    for (Eigen::Index j = 0; j < n; ++j) {
        const Eigen::Index a = j >= apart ? j - apart : std::min(j + 2 * apart, n - 1);
        const Eigen::Index b = j + apart < n ? j + apart : std::max<Eigen::Index>(j - 2 * apart, 0);
        const Eigen::ArrayXd u =
            frame.water_degC.col(j) - 0.5 * (frame.water_degC.col(a) + frame.water_degC.col(b));
        const Eigen::Index m = out.rows();
        out.col(j) = u.head(m) - 2.0 * u.segment(1, m) + u.tail(m);
    }
    return out;
}

void measure_noise(Frame& frame) {
    const Eigen::Index n = frame.n_place();
    const double step = frame.spacing_m();
    const auto apart = std::clamp<Eigen::Index>(
        static_cast<Eigen::Index>(std::ceil(6.0 * frame.response_sd_m / step)), 2,
        std::max<Eigen::Index>(2, n / 4));
    const Eigen::ArrayXXd fast = fast_part(frame, std::min(apart, n - 1));
    std::vector<double> sd(static_cast<std::size_t>(n));
    for (Eigen::Index j = 0; j < n; ++j) {
        std::vector<double> d(fast.col(j).begin(), fast.col(j).end());
        for (double& x : d)
            x = std::abs(x);
        sd[static_cast<std::size_t>(j)] = mad_to_sd * median(std::move(d)) / std::sqrt(6.0 * 1.5);
    }
    frame.white_K.resize(n);
    const Eigen::Index half = 15;
    for (Eigen::Index j = 0; j < n; ++j) {
        const auto from = static_cast<std::ptrdiff_t>(std::max<Eigen::Index>(0, j - half));
        const auto to = static_cast<std::ptrdiff_t>(std::min(n, j + half + 1));
        frame.white_K[j] = std::max(1e-6, median({sd.begin() + from, sd.begin() + to}));
    }
    // correlation of neighbours' noise: channels nearer than `apart` share nothing else here
    double power = 0.0;
    std::vector<double> shared(static_cast<std::size_t>(apart), 0.0);
    for (Eigen::Index j = apart; j + 2 * apart < n; ++j) {
        power +=
            fast.col(j).square().min(9.0 * 6.0 * 1.5 * frame.white_K[j] * frame.white_K[j]).mean();
        for (Eigen::Index lag = 1; lag < apart; ++lag) {
            const double cap = 9.0 * 6.0 * 1.5 * frame.white_K[j] * frame.white_K[j];
            shared[static_cast<std::size_t>(lag)] +=
                (fast.col(j) * fast.col(j + lag)).min(cap).max(-cap).mean();
        }
    }
    frame.correlated = 1.0;
    for (Eigen::Index lag = 1; lag < apart && power > 0.0; ++lag) {
        // the two reference channels are as correlated as the channel itself: ratio of 1.5 to 1.5
        const double r = shared[static_cast<std::size_t>(lag)] / power;
        if (r > 0.04)
            frame.correlated += 2.0 * r;
    }
    Eigen::ArrayXd common = frame.water_degC.rowwise().mean();
    std::vector<double> d;
    for (Eigen::Index i = 1; i + 1 < common.size(); ++i)
        d.push_back(std::abs(common[i - 1] - 2.0 * common[i] + common[i + 1]));
    frame.jitter_K = d.empty() ? nan : mad_to_sd * median(std::move(d)) / std::sqrt(6.0);
}

} // namespace

double median(std::vector<double> values) {
    values.erase(
        std::remove_if(values.begin(), values.end(), [](double v) { return !std::isfinite(v); }),
        values.end());
    if (values.empty())
        return nan;
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    if (values.size() % 2 == 1)
        return *middle;
    return 0.5 * (*middle + *std::max_element(values.begin(), middle));
}

double Frame::spacing_m() const {
    std::vector<double> gaps;
    for (Eigen::Index j = 1; j < place_m.size(); ++j)
        gaps.push_back(place_m[j] - place_m[j - 1]);
    return gaps.empty() ? 1.0 : median(std::move(gaps));
}

Eigen::ArrayXd at_times(const Series& series, const Eigen::ArrayXd& time_s) {
    const double beyond_s = 3600.0; // chosen here: loggers read each hour at the least
    Eigen::ArrayXd out = Eigen::ArrayXd::Constant(time_s.size(), nan);
    std::vector<double> t, v;
    for (Eigen::Index i = 0; i < series.time_s.size(); ++i)
        if (std::isfinite(series.value[i])) {
            t.push_back(series.time_s[i]);
            v.push_back(series.value[i]);
        }
    if (t.empty())
        return out;
    for (Eigen::Index i = 0; i < time_s.size(); ++i) {
        const double at = time_s[i];
        if (at <= t.front() || at >= t.back()) {
            const bool early = at <= t.front();
            if (std::abs(at - (early ? t.front() : t.back())) <= beyond_s)
                out[i] = early ? v.front() : v.back();
            continue;
        }
        const auto k =
            static_cast<std::size_t>(std::upper_bound(t.begin(), t.end(), at) - t.begin());
        if (t[k] - t[k - 1] <= 26.0 * 3600.0) // a longer hole is a hole
            out[i] = v[k - 1] + (v[k] - v[k - 1]) * (at - t[k - 1]) / (t[k] - t[k - 1]);
    }
    return out;
}

Frame make_frame(const StreamInput& input) {
    check_sizes(input);
    const std::string where = "stretch '" + input.config.stretch + "': ";
    Frame frame;
    frame.channel = usable_channels(input, frame);
    if (frame.channel.size() < 8)
        throw DataError(
            where + "only " + std::to_string(frame.channel.size()) +
            " channels are usable; inflows need at least 8, so check the stretch's ends "
            "and the exclusions");
    const std::vector<Eigen::Index> rows = usable_times(input.temperature_degC, frame.channel);
    if (rows.size() < 3)
        throw DataError(where + "only " + std::to_string(rows.size()) +
                        " times have values along most of it; inflows need at least 3");
    const bool against = input.config.flow == campaign::Flow::decreasing;
    if (against)
        std::reverse(frame.channel.begin(), frame.channel.end());
    frame.sign = against ? -1.0 : 1.0;
    frame.origin_m = input.fibre_m[frame.channel.front()];
    frame.interval_s = input.interval_s;
    frame.response_sd_m =
        std::max(0.05, input.spatial_response_m) / 2.563103; // 10-90 of a Gaussian
    const auto n = static_cast<Eigen::Index>(frame.channel.size());
    const auto m = static_cast<Eigen::Index>(rows.size());
    frame.fibre_m.resize(n);
    frame.time_s.resize(m);
    frame.water_degC.resize(m, n);
    for (Eigen::Index i = 0; i < m; ++i)
        frame.time_s[i] = input.time_s[rows[static_cast<std::size_t>(i)]];
    for (Eigen::Index j = 0; j < n; ++j) {
        const Eigen::Index from = frame.channel[static_cast<std::size_t>(j)];
        frame.fibre_m[j] = input.fibre_m[from];
        for (Eigen::Index i = 0; i < m; ++i)
            frame.water_degC(i, j) =
                input.temperature_degC(rows[static_cast<std::size_t>(i)], from);
    }
    frame.place_m = (frame.fibre_m - frame.origin_m) * frame.sign;
    frame.filled = fill_holes(frame.place_m, frame.water_degC);
    frame.mean_degC.resize(m);
    for (Eigen::Index i = 0; i < m; ++i) {
        const auto row = frame.water_degC.row(i);
        std::vector<double> values;
        for (Eigen::Index j = 0; j < n; ++j)
            values.push_back(row[j]);
        frame.mean_degC[i] = median(std::move(values));
    }
    measure_noise(frame);
    return frame;
}

} // namespace rillstrand::stream

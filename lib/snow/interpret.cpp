// SPDX-License-Identifier: Apache-2.0
#include "heat/snow_ground.hpp"
#include "snow/model.hpp"
#include "snow/sharpen.hpp"
#include "snow/snow.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numbers>

namespace rillstrand::snow {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double day_s = 86400.0;

/// Where neither coordinates nor utc_offset_h say it: the hour at which the record's mean daily
/// wave peaks, which on bare ground is about 13:30 local solar time (common practice, no source).
std::optional<double> offset_from_wave_s(const SnowInput& input) {
    double c = 0.0, s = 0.0, n = 0.0, size = 0.0;
    for (Eigen::Index i = 0; i < input.time_s.size(); ++i) {
        const double angle = 2.0 * std::numbers::pi * std::fmod(input.time_s(i), day_s) / day_s;
        for (Eigen::Index j = 0; j < input.temperature_degC.cols(); ++j) {
            const auto value = static_cast<double>(input.temperature_degC(i, j));
            if (std::isnan(value))
                continue;
            c += value * std::cos(angle);
            s += value * std::sin(angle);
            n += 1.0;
        }
    }
    size = n > 0.0 ? 2.0 * std::hypot(c, s) / n : 0.0;
    if (size < 0.05)
        return std::nullopt;
    const double peak_s = std::atan2(s, c) / (2.0 * std::numbers::pi) * day_s;
    const double late_s = 13736.0 * input.burial_depth_m / 0.12; // P / (2 pi) a damping depth
    double offset_s = 13.5 * 3600.0 + late_s - peak_s;
    while (offset_s > 0.5 * day_s)
        offset_s -= day_s;
    while (offset_s < -0.5 * day_s)
        offset_s += day_s;
    return offset_s;
}

double offset_of(const SnowInput& input, SnowFindings& findings) {
    if (input.config.utc_offset_h)
        return *input.config.utc_offset_h * 3600.0;
    if (input.longitude_deg)
        return solar_offset_s(*input.longitude_deg);
    const auto told = offset_from_wave_s(input);
    findings.cautions.push_back(
        told ? "No coordinates and no utc_offset_h: days begin " + text::fixed(-*told / 3600.0, 1) +
                   " h after 0:00 UTC, told from the hour at which the record peaks; say "
                   "utc_offset_h."
             : std::string{"No coordinates and no utc_offset_h: days are UTC days; say "
                           "utc_offset_h."});
    return told.value_or(0.0);
}

void add_air(const SnowInput& input, const Days& days, ModelInput& model) {
    if (!input.air_degC || input.air_degC->time_s.size() == 0)
        return;
    const Series& air = *input.air_degC;
    model.air_mean_degC = model.air_swing_K = Eigen::ArrayXd::Constant(days.n_day(), nan);
    Eigen::ArrayXd sum = Eigen::ArrayXd::Zero(days.n_day()), n = sum;
    Eigen::ArrayXd low = Eigen::ArrayXd::Constant(days.n_day(), 1e9), high = -low;
    Eigen::ArrayXi hours = Eigen::ArrayXi::Zero(days.n_day()); // thirds of the day that are seen
    for (Eigen::Index i = 0; i < air.time_s.size(); ++i) {
        const double at = (air.time_s(i) - days.first_s(0)) / day_s;
        if (at < 0.0 || at >= static_cast<double>(days.n_day()) || !std::isfinite(air.value(i)))
            continue;
        const auto d = static_cast<Eigen::Index>(at);
        sum(d) += air.value(i);
        n(d) += 1.0;
        low(d) = std::min(low(d), air.value(i));
        high(d) = std::max(high(d), air.value(i));
        hours(d) |= 1 << static_cast<int>(3.0 * (at - std::floor(at)));
    }
    for (Eigen::Index d = 0; d < days.n_day(); ++d)
        if (n(d) > 0.0) {
            model.air_mean_degC(d) = sum(d) / n(d);
            if (n(d) >= 4.0 && hours(d) == 7)
                model.air_swing_K(d) = high(d) - low(d);
        }
}

/// Starts that lead to different answers where a whole line goes quiet at once: leaning to neither,
/// to snow and to bare, and one that trusts the channels' common forcing.
struct Start {
    double lean, message_channels;
};
constexpr std::array<Start, 4> coherent_starts{{{0.0, 1.0}, {1.5, 1.0}, {-1.0, 1.0}, {0.0, 4.0}}};

/// Where the record allows several coherent answers, their mean, and how far the covered share
/// differs between them.
ModelResult run_models(const Days& days, ModelInput input, Eigen::ArrayXd& between) {
    ModelResult mean;
    Eigen::ArrayXXd sum;
    Eigen::ArrayXd share, square;
    double n = 0.0;
    for (const auto& [lean, channels] : coherent_starts) {
        input.lean = lean;
        input.message_channels = channels;
        ModelResult one = run_model(days, input);
        const Eigen::ArrayXd own = one.probability.rowwise().mean();
        if (n == 0.0) {
            sum = Eigen::ArrayXXd::Zero(one.probability.rows(), one.probability.cols());
            share = square = Eigen::ArrayXd::Zero(own.size());
            mean = one;
        }
        sum += one.probability;
        share += own;
        square += own * own;
        n += 1.0;
    }
    mean.probability = sum / n;
    between = (square / n - (share / n).square()).max(0.0).sqrt();
    return mean;
}

/// Adds to a share's sd what the coherent answers differ by.
void widen(SnowCover& cover, const Eigen::ArrayXd& between) {
    cover.covered_fraction_sd =
        (cover.covered_fraction_sd.square() + 1.5 * between.square()).sqrt();
}

void decide_states(SnowFindings& f) {
    const Eigen::Index n = f.days.n_day(), places = f.probability.cols();
    f.state.resize(n, places);
    f.condition.resize(n, places);
    for (Eigen::Index j = 0; j < places; ++j)
        for (Eigen::Index d = 0; d < n; ++d) {
            const double p = f.probability(d, j);
            const bool seen = std::isfinite(f.days.mean_degC(d, j));
            const double doubt = seen ? 0.08 : 0.3;
            State state = p > 0.5 ? State::snow : State::bare;
            if (std::isnan(p) || std::abs(p - 0.5) < doubt)
                state = State::unknown;
            f.state(d, j) = state;
            Condition condition = Condition::unknown;
            if (seen && state == State::snow)
                condition = f.days.near_zero_h(d, j) >= 16.0 && f.days.calm_swing_K(d, j) < 0.6
                                ? Condition::melting_snow
                                : Condition::dry_snow;
            else if (seen && state == State::bare)
                condition =
                    f.days.calm_swing_K(d, j) < 1.0 ? Condition::quiet_bare : Condition::bare;
            f.condition(d, j) = condition;
        }
}

void add_insulation(SnowFindings& f, const ModelResult& model) {
    const Eigen::Index places = f.probability.cols();
    SnowChannels& c = f.channels;
    c.under_snow_degC = model.under_snow_degC;
    c.insulation_index = c.depth_at_least_m = c.depth_at_least_dense_m =
        Eigen::ArrayXd::Constant(places, nan);
    for (Eigen::Index j = 0; j < places; ++j) {
        const double snow = f.probability.col(j).sum(); // NaN: no sample
        const double bare = static_cast<double>(f.days.n_day()) - snow;
        if (!(snow >= 5.0)) {
            c.under_snow_degC(j) = nan;
            continue;
        }
        if (!(bare >= 5.0))
            continue;
        c.insulation_index(j) = model.snow_share(j) / model.bare_share(j);
        double least = std::numeric_limits<double>::infinity(), most = 0.0;
        for (const double density : {100.0, 200.0, 300.0, 400.0, 500.0}) {
            // What reaches the ground has passed the snow; the ground's own damping is counted by
            // taking the square root: half of the logarithm is the contact with the ground.
            const double depth = heat::depth_from_damping_m(
                std::sqrt(std::min(1.0, c.insulation_index(j))), density);
            least = std::min(least, depth);
            most = std::max(most, depth);
        }
        c.depth_at_least_m(j) = least;
        c.depth_at_least_dense_m(j) = most;
    }
}

void add_classes(const SnowInput& input, SnowFindings& f) {
    const auto add = [&](const std::string& kind, const std::string& label,
                         const std::vector<Eigen::Index>& which) {
        if (!which.empty())
            f.classes.push_back({kind, label, static_cast<Eigen::Index>(which.size()),
                                 find_cover(f.days, f.probability, which)});
        if (!which.empty())
            widen(f.classes.back().cover, f.between);
    };
    const auto select = [](const Eigen::ArrayXd& values, double low, double high) {
        std::vector<Eigen::Index> which;
        for (Eigen::Index j = 0; j < values.size(); ++j)
            if (values(j) >= low && values(j) < high)
                which.push_back(j);
        return which;
    };
    std::vector<double> heights;
    for (const double z : input.elevation_m)
        if (std::isfinite(z))
            heights.push_back(z);
    if (heights.size() >= 3) {
        std::sort(heights.begin(), heights.end());
        const double third = heights[heights.size() / 3], two = heights[2 * heights.size() / 3];
        const double infinity = std::numeric_limits<double>::infinity();
        if (heights.back() - heights.front() >= 3.0) {
            add("elevation", "under " + text::fixed(third, 0) + " m",
                select(input.elevation_m, -infinity, third));
            add("elevation", text::fixed(third, 0) + " to " + text::fixed(two, 0) + " m",
                select(input.elevation_m, third, two));
            add("elevation", "from " + text::fixed(two, 0) + " m",
                select(input.elevation_m, two, infinity));
        }
    }
    if (input.slope_deg.size() > 0) {
        add("slope", "under 10 deg", select(input.slope_deg, 0.0, 10.0));
        add("slope", "10 to 25 deg", select(input.slope_deg, 10.0, 25.0));
        add("slope", "from 25 deg", select(input.slope_deg, 25.0, 91.0));
    }
    if (input.aspect_deg.size() > 0) {
        Eigen::ArrayXd turned = input.aspect_deg;
        for (double& a : turned)
            a = std::fmod(a + 45.0, 360.0);
        int quarter = 0;
        for (const char* label : {"north", "east", "south", "west"}) {
            add("aspect", label, select(turned, 90.0 * quarter, 90.0 * (quarter + 1)));
            ++quarter;
        }
    }
}

void add_cautions(SnowFindings& f) {
    double uncertain = 0.0;
    for (Eigen::Index d = 0; d < f.probability.rows(); ++d)
        for (Eigen::Index j = 0; j < f.probability.cols(); ++j)
            uncertain += std::abs(f.probability(d, j) - 0.5) < 0.3 ? 1.0 : 0.0;
    const double share = uncertain / static_cast<double>(f.probability.size());
    if (share > 0.1)
        f.cautions.push_back(text::fixed(100.0 * share, 0) +
                             " % of the channel-days are uncertain (probability 0.2 to 0.8): thin "
                             "snow, cloud or shade; compare with a camera or a pole.");
    f.cautions.emplace_back("Snow thinner than a few centimetres lets the day's swing through and "
                            "may be missed.");
    f.cautions.emplace_back("No depth of snow follows from these temperatures beyond the stated "
                            "lower bounds, and no stability of the snow.");
}

} // namespace

SnowFindings interpret(const SnowInput& input) {
    SnowFindings f;
    f.stretch = input.config.stretch;
    f.method = input.config.method;
    const double offset_s = offset_of(input, f);
    f.days =
        make_days(input.time_s, input.bin_s, input.temperature_degC, offset_s, input.zero_offset_K);
    if (f.days.n_day() < 2)
        throw DataError("[[snow]] of stretch '" + input.config.stretch +
                        "': the record covers under two days; snow shows in how days differ, so "
                        "give a longer record or take the analysis out");
    ModelInput m;
    m.fibre_m = input.fibre_m;
    m.burial_depth_m = input.burial_depth_m;
    m.spatial_response_m = input.spatial_response_m;
    m.zero_offset_K = input.zero_offset_K;
    add_air(input, f.days, m);
    ModelResult model = run_model(f.days, m);
    f.leak = find_leak(input, f.days, model.probability);
    if (f.leak > 0.05)
        model = run_models(make_days(input.time_s, input.bin_s,
                                     sharpened(input, f.leak, f.days, model.probability), offset_s,
                                     input.zero_offset_K),
                           m, f.between);
    else
        model = run_models(f.days, m, f.between);
    f.probability = model.probability;
    for (Eigen::Index j = 0; j < f.probability.cols(); ++j)
        if (!f.days.mean_degC.col(j).isFinite().any())
            f.probability.col(j).setConstant(nan);
    f.forcing_K = model.forcing_K;
    f.forcing_log_sd = model.forcing_log_sd;
    decide_states(f);
    const campaign::Snow& c = input.config;
    if (c.swing_below_c && c.mean_below_c && c.minimum_days)
        f.rule_state = threshold_states(f.days, *c.swing_below_c, *c.mean_below_c, *c.minimum_days);
    if (f.method == campaign::SnowMethod::threshold) {
        f.state = f.rule_state;
        f.method_text = "Fixed thresholds: a day is snow where its swing is under " +
                        text::number(*c.swing_below_c) + " K and its mean under " +
                        text::number(*c.mean_below_c) + " degC, in runs of " +
                        text::number(*c.minimum_days) +
                        " days or more. Probabilities are the model's, beside the rule.";
    } else {
        f.method_text =
            "Hidden Markov chain a channel of bare and snow, with the swing that bare ground would "
            "have shown that day as a level all channels share; parameters from the record.";
    }
    f.channels = find_channels(input.fibre_m, f.state, f.probability);
    add_insulation(f, model);
    Eigen::ArrayXXd share = f.probability;
    if (f.method == campaign::SnowMethod::threshold)
        share = (f.state == State::snow).cast<double>();
    f.cover = find_cover(f.days, share);
    widen(f.cover, f.between);
    if (f.method == campaign::SnowMethod::threshold) { // a rule has no probability: the model's sd
        SnowCover modelled = find_cover(f.days, f.probability);
        widen(modelled, f.between);
        f.cover.covered_fraction_sd = modelled.covered_fraction_sd;
    }
    add_classes(input, f);
    add_cautions(f);
    return f;
}

} // namespace rillstrand::snow

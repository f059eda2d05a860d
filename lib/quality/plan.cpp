// SPDX-License-Identifier: Apache-2.0
#include "quality/plan.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>

namespace rillstrand::quality {

namespace {

constexpr double missing = std::numeric_limits<double>::quiet_NaN();
constexpr double found_at_sd = 3.0;       ///< common practice, no source
constexpr double edge_responses = 1.5;    ///< left out at each end of a bath, see baths.hpp
constexpr double light_m_s = 299792458.0; ///< exact
constexpr double gaussian_10_to_90 =
    2.563103131; ///< 2 * 1.2815515655 sd, the normal law's quantile
constexpr double usual_gamma_K = 482.0;

const char* const kobayashi = "Kobayashi (1985), J. Hydrol. 76, 155-162";
const char* const allan = "Allan (1966), Proc. IEEE 54, 221-230";
const char* const practice = "common practice, no source";
const char* const geometry = "geometry";

void require(bool truth, const char* option, double value, const char* wanted) {
    if (!truth)
        throw UsageError{std::string{"--"} + option + " is " + text::number(value) + "; " + wanted};
}

void require_positive(const char* option, double value) {
    require(std::isfinite(value) && value > 0.0, option, value, "say a number above zero");
}

void require_not_negative(const char* option, double value) {
    require(std::isfinite(value) && value >= 0.0, option, value, "say zero or a number above");
}

void require_positive(const char* option, const std::optional<double>& value) {
    if (value)
        require_positive(option, *value);
}

void check(const PlanInput& p) {
    require_positive("noise-c", p.noise_K);
    require_positive("interval-s", p.interval_s);
    require_positive("average-s", p.average_s);
    require(p.average_s >= p.interval_s, "average-s", p.average_s,
            "say at least the time of one sample, --interval-s");
    require_positive("spacing-m", p.spacing_m);
    require_positive("response-m", p.response_m);
    require_not_negative("floor-c", p.floor_K);
    require_positive("reach-m", p.reach_m);
    require(p.share > 0.0 && p.share < 1.0, "share", p.share, "say a share between 0 and 1");
    require_positive("target-sd-c", p.target_sd_K);
    require_not_negative("probe-sd-c", p.probe_sd_K);
    require_not_negative("loss-db-km", p.loss_dB_km);
    require(p.refractive_index >= 1.0 && p.refractive_index < 3.0, "refractive-index",
            p.refractive_index, "say a number from 1 to 3; glass fibre has about 1.468");
    if (p.contrast_K)
        require(
            std::isfinite(*p.contrast_K) && *p.contrast_K != 0.0, "contrast-c", *p.contrast_K,
            "without a contrast no inflow shows; say the inflow's temperature minus the stream's");
    require_positive("discharge-m3s", p.discharge_m3s);
    require_positive("length-m", p.length_m);
    require_positive("spot-m", p.spot_m);
    require_positive("winding-diameter-m", p.winding_diameter_m);
    require_positive("winding-pitch-m", p.winding_pitch_m);
    if (p.winding_diameter_m.has_value() != p.winding_pitch_m.has_value())
        throw UsageError{
            "a winding needs both --winding-diameter-m and --winding-pitch-m; say the other"};
}

/// Samples nearer than the response are not independent.
double independent_m(const PlanInput& p) {
    return std::max(p.spacing_m, p.response_m);
}

double independent_samples(const PlanInput& p, double length_m) {
    return std::max(1.0, std::floor(length_m / independent_m(p)));
}

/// One sample's noise where the fibre is worst.
double worst_noise_K(const PlanInput& p) {
    return p.noise_K * std::pow(10.0, p.loss_dB_km * p.length_m.value_or(0.0) / 1000.0 / 10.0);
}

void noise_rows(const PlanInput& p, std::vector<PlanRow>& rows) {
    const double worst_K = worst_noise_K(p);
    if (p.length_m && p.loss_dB_km > 0.0)
        rows.push_back({"noise of one sample at the far end", worst_K, "K",
                        "noise 10^(loss length / 10)",
                        "shot noise grows as the root of the light lost both ways", ""});
    rows.push_back({"noise of the mean over the averaging time",
                    averaged_noise_K(worst_K, p.interval_s, p.average_s, p.floor_K), "K",
                    "sqrt(noise^2 interval / average + floor^2)", allan, ""});
    PlanRow gain{"averaging time beyond which little is gained",
                 missing,
                 "s",
                 "noise^2 interval / floor^2",
                 allan,
                 ""};
    if (p.floor_K > 0.0)
        gain.value =
            std::max(p.interval_s, worst_K * worst_K * p.interval_s / p.floor_K / p.floor_K);
    else
        gain.remark = "no floor is said, and no instrument is without one: say --floor-c";
    rows.push_back(gain);
}

void inflow_rows(const PlanInput& p, std::vector<PlanRow>& rows) {
    const double contrast_K = std::abs(*p.contrast_K);
    const double worst_K = worst_noise_K(p);
    const double n = independent_samples(p, p.reach_m);
    // The floor is of one channel and may be shared by neighbours: length does not lower it.
    const double side_K =
        averaged_noise_K(worst_K / std::sqrt(n), p.interval_s, p.average_s, p.floor_K);
    const double smallest = smallest_share(side_K, contrast_K);
    const char* const none =
        "the noise is larger than the contrast: average longer or wait for more";
    rows.push_back({"smallest inflow share that can be found", smallest, "1",
                    "f = 3 sd(f), sd(f)^2 = (s / contrast)^2 (1 + (1 - f)^2)", kobayashi,
                    std::isnan(smallest) ? none : ""});
    if (p.discharge_m3s)
        rows.push_back({"smallest inflow that can be found",
                        *p.discharge_m3s * smallest / (1.0 - smallest), "m3 s-1", "Q f / (1 - f)",
                        kobayashi, std::isnan(smallest) ? none : ""});
    const double wanted_K = side_sd_for_share_K(p.share, contrast_K);
    PlanRow time{"averaging time that finds a share of " + text::number(p.share),
                 missing,
                 "s",
                 "noise^2 interval / (n (s^2 - floor^2))",
                 kobayashi,
                 ""};
    if (wanted_K > p.floor_K)
        time.value = std::max(p.interval_s, worst_K * worst_K * p.interval_s / n /
                                                (wanted_K * wanted_K - p.floor_K * p.floor_K));
    else
        time.remark = "no averaging finds it, the floor alone hides it: wait for more contrast";
    rows.push_back(time);
    rows.push_back({"contrast that shows that share in the averaging time",
                    side_K / side_sd_for_share_K(p.share, 1.0), "K", "3 s sqrt(1 + (1 - f)^2) / f",
                    kobayashi, ""});
}

void bath_rows(const PlanInput& p, std::vector<PlanRow>& rows) {
    const double n = std::max(2.0, std::ceil(std::pow(p.noise_K / p.target_sd_K, 2)));
    const double length_m = 2.0 * edge_responses * p.response_m + n * independent_m(p);
    rows.push_back({"fibre in each bath, at least", length_m, "m",
                    "3 response + max(2, (noise / target)^2) max(response, spacing)", practice,
                    ""});
    if (!p.length_m)
        return;
    const double bath_K =
        std::hypot(p.probe_sd_K, averaged_noise_K(worst_noise_K(p) / std::sqrt(n), p.interval_s,
                                                  p.average_s, p.floor_K));
    const double apart_m = bath_distance_m(*p.length_m, bath_K, p.target_sd_K);
    rows.push_back(
        {"distance between the first and the last bath, at least", apart_m, "m",
         "length / u, s sqrt(u^2 + (1 - u)^2) = target",
         "error of a straight line through two points",
         std::isnan(apart_m) ? "no distance is enough: better probes or longer averages" : ""});
    rows.push_back({"baths a single-ended adjustment from powers needs, at least", 3.0, "1",
                    "one for each of gamma, C and differential loss",
                    "three unknowns, two temperatures among them",
                    "and one more, or a jump of the log-ratio, for each splice with a loss"});
}

void fibre_rows(const PlanInput& p, std::vector<PlanRow>& rows) {
    rows.push_back(
        {"error of a splice of 0.01 dB left unmended, at 20 degC", step_loss_error_K(0.01, 20.0),
         "K", "T^2 / gamma * dB ln(10) / 10",
         "derivative of T = gamma / (ln(Ps / Pas) + C - dalpha z); gamma 482 K, from memory", ""});
    rows.push_back({"length error of a refractive index 0.001 off",
                    1000.0 * 0.001 / p.refractive_index, "m km-1", "1000 dn / n",
                    "definition of the refractive index", ""});
    if (p.length_m)
        rows.push_back({"highest pulse rate",
                        highest_pulse_rate_Hz(*p.length_m, p.refractive_index), "Hz",
                        "c / (2 n length)", "one pulse in the fibre at a time", ""});
    rows.push_back({"sampling against the response", p.response_m / p.spacing_m, "1",
                    "response / spacing", "two samples a response: the sampling theorem",
                    p.response_m < 2.0 * p.spacing_m ? "under 2: a sharp change may fall between "
                                                       "samples"
                                                     : ""});
    if (p.spot_m)
        rows.push_back({"share of a patch's contrast that is seen",
                        seen_of_patch(*p.spot_m, p.response_m), "1",
                        "erf(w / (2 sqrt(2) sigma)), sigma = response / 2.5631",
                        "convolution with a Gaussian", ""});
}

void winding_rows(const PlanInput& p, std::vector<PlanRow>& rows) {
    const auto height_mm = [&](double along_m) {
        return 1000.0 * winding_height_m(along_m, *p.winding_diameter_m, *p.winding_pitch_m);
    };
    const char* const helix = "along pitch / sqrt((pi diameter)^2 + pitch^2)";
    rows.push_back(
        {"height of a winding between samples", height_mm(p.spacing_m), "mm", helix, geometry, ""});
    rows.push_back({"height of a winding in one response", height_mm(p.response_m), "mm", helix,
                    geometry, "finer layers are blurred"});
    rows.push_back({"fibre for one metre of height", 1000.0 / height_mm(1.0), "m",
                    "1 / (pitch / sqrt((pi diameter)^2 + pitch^2))", geometry, ""});
}

} // namespace

double averaged_noise_K(double noise_K, double interval_s, double average_s, double floor_K) {
    const double n = std::max(1.0, average_s / interval_s);
    return std::sqrt(noise_K * noise_K / n + floor_K * floor_K);
}

double smallest_share(double side_sd_K, double contrast_K) {
    // f^2 = a (1 + (1 - f)^2) with a = (3 s / D)^2; its positive root stays below one while a < 1.
    const double a = std::pow(found_at_sd * side_sd_K / contrast_K, 2);
    if (!(a < 1.0))
        return missing;
    return (std::sqrt(a * a + 2.0 * a * (1.0 - a)) - a) / (1.0 - a);
}

double side_sd_for_share_K(double share, double contrast_K) {
    return share * std::abs(contrast_K) / found_at_sd /
           std::sqrt(1.0 + (1.0 - share) * (1.0 - share));
}

double seen_of_patch(double width_m, double response_m) {
    const double sigma_m = response_m / gaussian_10_to_90;
    return std::erf(width_m / (2.0 * std::numbers::sqrt2 * sigma_m));
}

double winding_height_m(double along_m, double diameter_m, double pitch_m) {
    return along_m * pitch_m / std::hypot(std::numbers::pi * diameter_m, pitch_m);
}

double bath_distance_m(double length_m, double bath_sd_K, double target_sd_K) {
    const double ratio = target_sd_K / bath_sd_K;
    const double root = 2.0 * ratio * ratio - 1.0;
    if (!(root >= 0.0))
        return missing;
    return length_m / (0.5 * (1.0 + std::sqrt(root)));
}

double metres_per_ns(double refractive_index) {
    return light_m_s * 1e-9 / (2.0 * refractive_index);
}

double highest_pulse_rate_Hz(double length_m, double refractive_index) {
    return light_m_s / (2.0 * refractive_index * length_m);
}

double step_loss_error_K(double loss_dB, double temperature_degC) {
    const double kelvin = temperature_degC + 273.15;
    return kelvin * kelvin / usual_gamma_K * loss_dB * std::numbers::ln10 / 10.0;
}

std::vector<PlanRow> make_plan(const PlanInput& input) {
    check(input);
    std::vector<PlanRow> rows;
    noise_rows(input, rows);
    if (input.contrast_K)
        inflow_rows(input, rows);
    bath_rows(input, rows);
    fibre_rows(input, rows);
    if (input.winding_diameter_m)
        winding_rows(input, rows);
    return rows;
}

} // namespace rillstrand::quality

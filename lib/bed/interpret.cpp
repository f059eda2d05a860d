// SPDX-License-Identifier: Apache-2.0
#include "bed/bed.hpp"
#include "bed/depths.hpp"
#include "bed/pairs.hpp"
#include "bed/profiles.hpp"
#include "bed/steady.hpp"

#include "base/text.hpp"
#include "heat/ground.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::bed {

namespace {

using Eigen::ArrayXd;
using Eigen::Index;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double hour_s = 3600.0;
constexpr double day_s = 86400.0;

double median(std::vector<double> values) {
    values.erase(
        std::remove_if(values.begin(), values.end(), [](double v) { return !std::isfinite(v); }),
        values.end());
    if (values.empty())
        return nan;
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    return *middle;
}

/// Works on one rod; every step fills its part of the findings.
class Interpreter {
public:
    explicit Interpreter(const BedInput& input) : m_in{input} {
        m_out.name = input.config.name;
        m_out.stretch = input.config.stretch;
        m_out.fibre_per_height = fibre_per_height(input.config.winding);
        m_out.averaging_height_m = averaging_height_m(input);
        m_out.diffusivity_m2_s = m_out.diffusivity_sd_m2_s = nan;
        m_out.mean_flux_m_s = m_out.mean_flux_sd_m_s = m_out.noise_K = nan;
    }

    BedFindings run() {
        m_places = sort_places(m_in);
        m_used = used(m_places);
        refuse_too_little();
        check_properties();
        daily_waves();
        fit();
        pairs();
        steady();
        choose_best();
        close_without_pores();
        return m_out;
    }

private:
    std::string who() const { return "[[bed]] '" + m_in.config.name + "'"; }
    void warn(const char* code, const std::string& text) {
        for (const auto& w : m_out.warnings)
            if (w.code == code)
                return;
        m_out.warnings.push_back({code, who() + ": " + text});
    }
    double span_s() const {
        return m_in.time_s.size() < 2 ? 0.0 : m_in.time_s(m_in.time_s.size() - 1) - m_in.time_s(0);
    }
    /// Places in the bed that are used, water apart.
    Index n_in_bed() const {
        return std::count_if(m_used.begin(), m_used.end(), [](const Place& p) {
            return p.use != Use::water && p.depth_m >= 0.0;
        });
    }

    void refuse_too_little() {
        const auto in_bed = std::count_if(m_places.begin(), m_places.end(), [](const Place& p) {
            return p.use != Use::water && p.use != Use::above_bed && p.depth_m >= -1e-3;
        });
        if (in_bed < 2)
            throw DataError(
                who() + ": " + std::to_string(in_bed) + " of " + std::to_string(m_places.size()) +
                " channels of stretch '" + m_in.config.stretch +
                "' lie under the bed's surface at fibre distance " +
                text::number(m_in.config.datum_fibre_m) +
                " m, and a flux needs two depths; correct datum_fibre_m, direction or the stretch");
        if (n_in_bed() < 2)
            throw DataError(who() + ": fewer than two depths in the bed have samples in half of "
                                    "the record; take a longer or fuller record");
        if (span_s() < 1.5 * day_s)
            throw DataError(who() + ": the record is " + text::fixed(span_s() / hour_s, 1) +
                            " h long, and a flux needs a day and a half; take a longer record");
    }

    void check_properties() {
        const campaign::Bed& c = m_in.config;
        if (!plausible_diffusivity(c.thermal_conductivity_wmk / c.heat_capacity_jm3k))
            warn("bed-diffusivity",
                 "the stated properties give a diffusivity of " +
                     text::fixed(day_s * c.thermal_conductivity_wmk / c.heat_capacity_jm3k, 3) +
                     " m2/d, outside the 0.028 to 0.180 of streambeds; check "
                     "thermal_conductivity_wmk and heat_capacity_jm3k");
        // Grains of streambeds hold 1.8 to 2.5 MJ m-3 K-1 (quartz, clay, rock: Moene & van Dam
        // 2014, table 2.2); a bed of them, saturated, must lie between.
        const double low = heat::saturated_heat_capacity_J_m3_K(c.porosity, 1.8e6);
        const double high = heat::saturated_heat_capacity_J_m3_K(c.porosity, 2.5e6);
        if (c.porosity > 0.0 && (c.heat_capacity_jm3k < low || c.heat_capacity_jm3k > high))
            warn("bed-capacity",
                 "a saturated bed of porosity " + text::number(c.porosity) + " holds " +
                     text::fixed(low / 1e6, 2) + " to " + text::fixed(high / 1e6, 2) +
                     " MJ m-3 K-1, and heat_capacity_jm3k says " +
                     text::fixed(c.heat_capacity_jm3k / 1e6, 2) +
                     "; the flux is in proportion to it, so correct one of the two");
    }

    // ---- the daily wave by depth -------------------------------------------------------------

    bool daily() const { return m_in.interval_s <= 3.0 * hour_s + 1.0; }

    void daily_waves() {
        if (daily()) {
            const double first = std::ceil(m_in.time_s(0) / day_s - 0.5) * day_s;
            for (double begin = first;
                 begin + 2.0 * day_s <= m_in.time_s(m_in.time_s.size() - 1) + m_in.interval_s;
                 begin += day_s)
                add_window(begin, begin + 2.0 * day_s);
        }
        for (std::size_t k = 0; k < m_places.size(); ++k) {
            const Place& p = m_places[k];
            DepthWave d;
            d.fibre_m = p.fibre_m;
            d.depth_m = p.depth_m;
            d.noise_K = p.noise_K;
            d.use = to_string(p.use);
            const ArrayXd values = m_in.temperature_degC.col(p.column);
            const double n = static_cast<double>(values.isFinite().count());
            d.mean_degC = n > 0.0 ? values.isFinite().select(values, 0.0).sum() / n : nan;
            const auto over = [&](auto get) {
                std::vector<double> all;
                for (const Window& w : m_windows)
                    all.push_back(get(w.waves[k]));
                return median(all);
            };
            d.amplitude_K = over([](const Harmonic& h) { return h.amplitude; });
            d.amplitude_sd_K = over([](const Harmonic& h) { return h.amplitude_sd; });
            d.phase_rad = over([](const Harmonic& h) { return h.phase_rad; });
            d.phase_sd_rad = over([](const Harmonic& h) { return h.phase_sd_rad; });
            d.second_amplitude_K = over([](const Harmonic& h) { return h.second_amplitude; });
            d.trend_K_d = over([](const Harmonic& h) { return h.trend_per_d; });
            m_out.depths.push_back(d);
        }
    }

    void add_window(double begin_s, double end_s) {
        const double* t = m_in.time_s.data();
        const double* last = t + m_in.time_s.size();
        const Index first = std::lower_bound(t, last, begin_s) - t;
        const Index count = std::lower_bound(t, last, end_s) - t - first;
        if (static_cast<double>(count) * m_in.interval_s < 0.75 * (end_s - begin_s))
            return;
        Window w{begin_s, end_s, {}};
        for (const Place& p : m_places)
            w.waves.push_back(
                fit_harmonic(m_in.time_s.segment(first, count),
                             m_in.temperature_degC.col(p.column).segment(first, count)));
        m_windows.push_back(w);
    }

    // ---- all depths at once ------------------------------------------------------------------

    void fit() {
        const Index n_water = std::count_if(m_used.begin(), m_used.end(),
                                            [](const Place& p) { return p.use == Use::water; });
        const Index n_top = std::max<Index>(1, n_water);
        if (static_cast<Index>(m_used.size()) < n_top + 2) {
            warn("bed-few-depths", "only two depths are left, too few for a fit through all; the "
                                   "daily wave between the two is all that tells a flux");
            return;
        }
        BedInput smooth = m_in;
        if (m_in.interval_s <= hour_s + 1.0)
            smooth.temperature_degC = smoothed_in_time(m_in.time_s, m_in.temperature_degC, hour_s);
        const campaign::Bed& c = m_in.config;
        const double length = m_used.back().depth_m - (n_water > 0 ? 0.0 : m_used[0].depth_m);
        m_out.knot_s = choose_knot_s(length, c.thermal_conductivity_wmk / c.heat_capacity_jm3k,
                                     m_in.interval_s);
        m_out.window_s = std::max(6.0 * hour_s, 2.0 * m_out.knot_s);
        // Long records go piece by piece; pieces overlap so that no row stands at an end.
        const double piece_s = 150.0 * m_out.knot_s;
        const double overlap_s = 8.0 * m_out.knot_s;
        const double first_s = m_in.time_s(0), last_s = m_in.time_s(m_in.time_s.size() - 1);
        const double pieces = std::max(1.0, std::ceil((last_s - first_s) / piece_s));
        const double each_s = (last_s - first_s) / pieces;
        for (double k = 0.0; k < pieces; k += 1.0) {
            const double core_begin = first_s + k * each_s, core_end = core_begin + each_s;
            fit_piece(smooth, core_begin - overlap_s, core_end + overlap_s, core_begin,
                      k + 1.5 > pieces ? last_s + 1.0 : core_end, n_top);
        }
        summarise_fit();
    }

    void fit_piece(const BedInput& smooth, double from_s, double to_s, double core_begin_s,
                   double core_end_s, Index n_top) {
        FitInput in;
        in.trust = m_out.trust;
        in.conductivity_W_m_K = m_in.config.thermal_conductivity_wmk;
        in.capacity_J_m3_K = m_in.config.heat_capacity_jm3k;
        in.profile =
            cut_profile(smooth, m_used, from_s, to_s, std::max(1.2 * day_s, 4.0 * m_out.knot_s));
        if (in.profile.segments.empty() || !in.profile.observed_degC.isFinite().any()) {
            warn("bed-gaps", "some days have no stretch without a gap long enough for a fit");
            return;
        }
        const Index n = in.profile.depth_m.size();
        in.noise_K.resize(n);
        double noise = 0.0;
        for (Index j = 0; j < n; ++j) {
            in.noise_K(j) = std::max(1e-4, m_used[static_cast<std::size_t>(n_top + j)].noise_K);
            noise += in.noise_K(j) / static_cast<double>(n);
        }
        in.boundary_noise_K = noise / std::sqrt(static_cast<double>(n_top));
        const FitResult f = fit_profile(in);
        if (!std::isfinite(f.diffusivity_m2_s) || !f.flux_unit.allFinite()) {
            warn("bed-fit-failed", "the fit through all depths found no solution in some days");
            return;
        }
        if (!f.converged)
            warn("bed-fit-unsettled", "the fit through all depths had not quite settled when it "
                                      "was stopped; its sd may be too small");
        m_fits.push_back(f);
        const double w = m_out.window_s;
        for (double begin = std::floor(core_begin_s / w) * w; begin < core_end_s; begin += w) {
            const double middle = begin + 0.5 * w;
            if (middle < core_begin_s || middle >= core_end_s ||
                !inside(in.profile, begin, begin + w))
                continue;
            const FitResult::Mean q = f.mean(begin, begin + w, m_out.trust.depth_scale);
            FluxRow row;
            row.time_s = middle;
            row.window_s = w;
            row.method = "fit";
            row.flux_m_s = q.flux_m_s;
            row.flux_sd_m_s = std::hypot(q.sd_m_s, unmodelled_m_s(in, f, n_top, q.flux_m_s));
            row.diffusivity_m2_s = f.diffusivity_m2_s;
            row.diffusivity_sd_m2_s = f.diffusivity_sd_m2_s;
            row.upper_m = in.profile.top_m;
            row.lower_m = in.profile.bottom_m;
            m_fit_rows.push_back(row);
        }
    }

    /// What the model leaves out, as a flux. A conductivity that changes by a tenth over the rod
    /// more than the fit's layers show looks like a flux of that change over the water's heat
    /// capacity. Without water above the bed in the record, the uppermost channel that a fast
    /// upward flow lets change is itself a mean over the steep profile (share of the flux: from
    /// simulated beds).
    double unmodelled_m_s(const FitInput& in, const FitResult& f, Index n_top, double flux_m_s) {
        const double length = in.profile.bottom_m - in.profile.top_m;
        const double layered =
            0.1 * in.conductivity_W_m_K / (heat::water_heat_capacity_J_m3_K * length);
        if (n_top > 1 || in.profile.averaging_m > 0.0 || flux_m_s > 0.0)
            return layered;
        const double steep = heat::front_velocity_m_s(-flux_m_s, in.capacity_J_m3_K) /
                             f.diffusivity_m2_s * m_out.averaging_height_m;
        const double share = std::min(0.6, 0.025 * steep * steep);
        if (share > 0.1)
            warn("bed-blurred",
                 "water comes up so fast that what changes lies within the height that one channel "
                 "averages, and no channel of the stretch stands in the water above; let the "
                 "stretch begin some winding turns above the bed");
        return std::hypot(layered, share * flux_m_s);
    }

    /// Whether at least half of a window has samples.
    static bool inside(const Profile& p, double begin_s, double end_s) {
        double held = 0.0;
        for (const Segment& s : p.segments) {
            const double a = p.time_s(s.first) - 0.5 * p.step_s;
            const double b = p.time_s(s.first + s.count - 1) + 0.5 * p.step_s;
            held += std::max(0.0, std::min(b, end_s) - std::max(a, begin_s));
        }
        return held >= 0.5 * (end_s - begin_s);
    }

    void summarise_fit() {
        if (m_fits.empty())
            return;
        double kappa = 0.0, sd = 0.0, noise = 0.0;
        const double n = static_cast<double>(m_fits.size());
        for (const FitResult& f : m_fits) {
            kappa += f.diffusivity_m2_s / n;
            sd += f.diffusivity_sd_m2_s / n;
            noise += f.noise_K / n;
        }
        m_out.diffusivity_m2_s = kappa;
        m_out.diffusivity_sd_m2_s = sd;
        m_out.noise_K = noise;
        const double stated = m_in.config.thermal_conductivity_wmk / m_in.config.heat_capacity_jm3k;
        if (!plausible_diffusivity(kappa))
            warn("bed-diffusivity", "the fitted diffusivity of " + text::fixed(day_s * kappa, 3) +
                                        " m2/d is outside the 0.028 to 0.180 of streambeds; check "
                                        "winding, datum_fibre_m and the stated properties");
        if (std::abs(std::log(kappa / stated)) > 0.2)
            warn("bed-spacing",
                 "the temperatures ask for a diffusivity " + text::fixed(kappa / stated, 2) +
                     " times the stated one, as depths wrong by a factor of " +
                     text::fixed(std::sqrt(stated / kappa), 2) +
                     " would; check pitch and diameter of the winding (to the fibre's centre), "
                     "scour and fill, and the stated properties");
        m_out.evidence.push_back("fit through " + std::to_string(m_used.size()) +
                                 " channels from " + text::fixed(m_used.front().depth_m, 2) +
                                 " to " + text::fixed(m_used.back().depth_m, 2) + " m: residual " +
                                 text::fixed(noise, 3) + " K, diffusivity " +
                                 text::fixed(1e6 * kappa, 3) + " ± " + text::fixed(1e6 * sd, 3) +
                                 " mm2/s (stated " + text::fixed(1e6 * stated, 3) + ")");
    }

    // ---- pairs and means ---------------------------------------------------------------------

    /// Whether the fitted flux changes much inside a window.
    bool unsteady(double begin_s, double end_s) const {
        double low = 1.0, high = -1.0, sd = 0.0, n = 0.0;
        for (const FluxRow& r : m_fit_rows)
            if (r.time_s >= begin_s && r.time_s <= end_s) {
                low = std::min(low, r.flux_m_s);
                high = std::max(high, r.flux_m_s);
                sd += r.flux_sd_m_s;
                n += 1.0;
            }
        if (n < 2.0)
            return false;
        return high - low > 4.0 * sd / n + 0.25 * std::max(std::abs(low), std::abs(high));
    }

    void pairs() {
        std::size_t refused = 0;
        std::vector<std::size_t> in_use;
        std::vector<Place> places;
        for (std::size_t k = 0; k < m_places.size(); ++k)
            if (m_places[k].use == Use::fitted || m_places[k].use == Use::boundary) {
                in_use.push_back(k);
                places.push_back(m_places[k]);
            }
        for (const Window& w : m_windows) {
            std::vector<Harmonic> waves;
            for (const std::size_t k : in_use)
                waves.push_back(w.waves[k]);
            const Pair pair = choose_pair(places, waves, m_out.averaging_height_m);
            if (pair.lower == nullptr) {
                ++refused;
                continue;
            }
            const bool change = unsteady(w.begin_s, w.end_s);
            for (FluxRow row : pair_fluxes(pair, m_in.config, m_out.trust)) {
                row.time_s = 0.5 * (w.begin_s + w.end_s);
                row.window_s = w.end_s - w.begin_s;
                if (change && row.flag.empty())
                    row.flag = "bed-unsteady";
                m_pair_rows.push_back(row);
            }
            if (change)
                warn("bed-unsteady", "flux changes within some of the two-day windows of the "
                                     "daily wave, whose methods take it as steady; their rows are "
                                     "flagged, the fit through all depths follows");
        }
        if (refused > 0)
            warn("bed-deep-amplitude",
                 "in " + std::to_string(refused) + " of " + std::to_string(m_windows.size()) +
                     " windows the daily wave below is under five times its sd, so that no pair "
                     "of depths tells a flux; water that comes up fast or dull days do that");
    }

    void steady() {
        const double window = 7.0 * day_s;
        if (span_s() < 3.0 * day_s || n_in_bed() < 4)
            return;
        const double whole = std::max(1.0, std::floor(span_s() / window));
        const double each = span_s() / whole;
        for (double k = 0.0; k < whole; k += 1.0)
            add_steady(m_in.time_s(0) + k * each, each);
    }

    void add_steady(double begin_s, double window_s) {
        std::vector<double> z, mean;
        double unrest_K = 0.0;
        for (const Place& p : m_used) {
            if (p.use == Use::water || p.depth_m < 0.5 * m_out.averaging_height_m)
                continue;
            double sum = 0.0, n = 0.0, all = 0.0, early = 0.0, n_early = 0.0;
            for (Index i = 0; i < m_in.time_s.size(); ++i) {
                if (m_in.time_s(i) < begin_s || m_in.time_s(i) > begin_s + window_s)
                    continue;
                all += 1.0;
                const double v = m_in.temperature_degC(i, p.column);
                if (!std::isnan(v)) {
                    sum += v;
                    n += 1.0;
                    if (m_in.time_s(i) < begin_s + 0.5 * window_s) {
                        early += v;
                        n_early += 1.0;
                    }
                }
            }
            if (n_early > 0.0 && n > n_early)
                unrest_K =
                    std::max(unrest_K, std::abs(early / n_early - (sum - early) / (n - n_early)));
            if (n > 0.8 * all && n > 3.0) {
                z.push_back(p.depth_m);
                mean.push_back(sum / n);
            }
        }
        if (z.size() < 4)
            return;
        const auto n = static_cast<Index>(z.size());
        // Offsets of channels (common practice, no source), and how far the halves of the window
        // part: a profile that is still on its way bends without any flux.
        const double scatter_K = std::hypot(0.03, unrest_K);
        const SteadyFlux q = steady_flux(
            Eigen::Map<const ArrayXd>(z.data(), n), Eigen::Map<const ArrayXd>(mean.data(), n),
            scatter_K, m_in.config.thermal_conductivity_wmk,
            std::hypot(m_out.trust.conductivity, m_out.trust.conductivity_layer));
        FluxRow row;
        row.time_s = begin_s + 0.5 * window_s;
        row.window_s = window_s;
        row.method = "steady";
        row.flux_m_s = q.flux_m_s;
        row.flux_sd_m_s = q.sd_m_s;
        row.diffusivity_m2_s = row.diffusivity_sd_m2_s = nan;
        row.upper_m = z.front();
        row.lower_m = z.back();
        if (unsteady(begin_s, begin_s + window_s))
            row.flag = "bed-unsteady";
        m_steady_rows.push_back(row);
    }

    // ---- the answer --------------------------------------------------------------------------

    void choose_best() {
        std::vector<FluxRow> all = m_fit_rows;
        for (const char* method : {"joint", "amplitude", "phase"})
            for (const FluxRow& row : m_pair_rows)
                if (row.method == method)
                    all.push_back(row);
        all.insert(all.end(), m_steady_rows.begin(), m_steady_rows.end());
        for (const char* method : {"fit", "joint", "amplitude", "steady"}) {
            const bool any = std::any_of(all.begin(), all.end(), [&](const FluxRow& r) {
                return r.method == method && std::isfinite(r.flux_m_s);
            });
            if (!any)
                continue;
            m_out.method = method;
            for (const FluxRow& row : all)
                if (row.method == method)
                    m_out.series.push_back(row);
            break;
        }
        m_out.methods = m_out.series;
        for (const FluxRow& row : all)
            if (row.method != m_out.method)
                m_out.methods.push_back(row);
        if (m_out.series.empty()) {
            warn("bed-no-flux", "no method tells a flux from this record");
            return;
        }
        m_out.window_s = m_out.series.front().window_s;
        summarise_series();
    }

    void summarise_series() {
        // Errors of properties are common to all rows, so the mean is hardly surer than a row.
        double sum = 0.0, sd = 0.0, n = 0.0;
        std::vector<double> kappa, kappa_sd;
        for (const FluxRow& r : m_out.series)
            if (std::isfinite(r.flux_m_s)) {
                sum += r.flux_m_s;
                sd += r.flux_sd_m_s;
                n += 1.0;
                kappa.push_back(r.diffusivity_m2_s);
                kappa_sd.push_back(r.diffusivity_sd_m2_s);
            }
        m_out.mean_flux_m_s = n > 0.0 ? sum / n : nan;
        m_out.mean_flux_sd_m_s = n > 0.0 ? sd / n : nan;
        if (m_out.method != "fit") {
            m_out.diffusivity_m2_s = median(kappa);
            m_out.diffusivity_sd_m2_s = median(kappa_sd);
        }
    }

    /// Without pores no water flows: what a method finds is its own error.
    void close_without_pores() {
        if (m_in.config.porosity > 0.0 || m_out.series.empty())
            return;
        warn("bed-no-porosity", "porosity is 0, so no water flows; the flux that the fit takes "
                                "for one, " +
                                    text::fixed(day_s * m_out.mean_flux_m_s, 4) +
                                    " m/d, is its own error and is given as the flux's sd");
        const auto close = [](FluxRow& r) {
            if (std::isnan(r.flux_m_s))
                return;
            r.flux_sd_m_s = std::hypot(r.flux_sd_m_s, r.flux_m_s);
            r.flux_m_s = 0.0;
        };
        for (FluxRow& r : m_out.series)
            close(r);
        for (FluxRow& r : m_out.methods)
            close(r);
        m_out.mean_flux_sd_m_s = std::hypot(m_out.mean_flux_sd_m_s, m_out.mean_flux_m_s);
        m_out.mean_flux_m_s = 0.0;
    }

    struct Window {
        double begin_s = 0.0, end_s = 0.0;
        std::vector<Harmonic> waves; // as m_places
    };

    const BedInput& m_in;
    BedFindings m_out;
    std::vector<Place> m_places, m_used;
    std::vector<Window> m_windows;
    std::vector<FitResult> m_fits;
    std::vector<FluxRow> m_fit_rows, m_pair_rows, m_steady_rows;
};

} // namespace

BedFindings interpret(const BedInput& input) {
    return Interpreter{input}.run();
}

} // namespace rillstrand::bed

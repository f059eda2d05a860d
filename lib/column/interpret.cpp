// SPDX-License-Identifier: Apache-2.0
#include "column/column.hpp"
#include "column/motion.hpp"
#include "column/readings.hpp"
#include "column/structure.hpp"

#include "base/text.hpp"
#include "heat/water.hpp"
#include "record/winding.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::column {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr int n_draws = 40;

/// Figures of one profile.
struct Figures {
    Thermocline thermocline;
    double mixed_layer_m, stability, heat;
};

/// A profile with what is made of it once.
struct Instant {
    ColumnState state;
    FittedProfile fitted;
    Eigen::Index nodes = 0; ///< of the grid, down to the deepest reading
};

class Interpreter {
public:
    explicit Interpreter(const ColumnInput& input)
        : m_input{input}, m_readings{input}, m_fitter{checked_bottom(), n_draws} {}

    ColumnFindings run() {
        const auto n = m_input.time_s.size();
        std::vector<Instant> instants(static_cast<std::size_t>(n));
        tbb::parallel_for(Eigen::Index{0}, n,
                          [&](Eigen::Index i) { instants[static_cast<std::size_t>(i)] = look(i); });
        ColumnFindings out;
        out.name = m_input.config.name;
        out.stretch = m_input.config.stretch;
        for (const auto& instant : instants)
            out.series.push_back(instant.state);
        describe(out);
        follow_isotherms(instants, out);
        thin_profiles(instants, out);
        follow_motion(instants, out);
        warn(out);
        return out;
    }

private:
    double checked_bottom() const {
        const double bottom_m = m_readings.deepest_m();
        if (m_readings.groups() < 3)
            throw DataError{"column '" + m_input.config.name +
                            "' has fewer than three depths; a profile needs more"};
        if (!(bottom_m > 0.2))
            throw DataError{"column '" + m_input.config.name +
                            "': no channel is ever under water; check datum_fibre_m, direction, "
                            "datum_elevation_m and the water level"};
        return bottom_m;
    }

    Profile profile_of(const Eigen::ArrayXd& depth_m, const Eigen::ArrayXd& temperature) const {
        return {depth_m, temperature, densities(temperature, m_input.config.salinity_gkg)};
    }

    Hypsograph lake(double bottom_m) const {
        return m_input.lake ? *m_input.lake : Hypsograph::constant(bottom_m);
    }

    /// @param shown  set to the profile that layers are told from: settled
    Figures figures(const Profile& raw, const Hypsograph& lake, bool inverse,
                    Profile& shown) const {
        shown = raw;
        shown.density_kg_m3 = settled(raw.density_kg_m3);
        return {thermocline(shown, inverse), mixed_layer_depth_m(shown),
                schmidt_stability_J_m2(raw, lake), heat_content_J_m2(raw, lake)};
    }

    static ColumnState unknown(double time_s, double level_m, int in_air) {
        ColumnState s;
        s.time_s = time_s;
        s.level_m = level_m;
        s.channels_in_air = in_air;
        for (double* value :
             {&s.surface_c, &s.bottom_c, &s.mixed_layer_depth_m, &s.mixed_layer_depth_sd_m,
              &s.thermocline_depth_m, &s.thermocline_depth_sd_m, &s.temperature_step_depth_m,
              &s.metalimnion_top_m, &s.metalimnion_bottom_m, &s.max_gradient_cm,
              &s.max_density_gradient, &s.buoyancy_frequency_max_s1, &s.schmidt_stability_jm2,
              &s.schmidt_stability_sd_jm2, &s.heat_content_jm2, &s.heat_content_sd_jm2,
              &s.lake_number, &s.wedderburn_number})
            *value = nan;
        return s;
    }

    Instant look(Eigen::Index i) const {
        Instant out;
        int in_air = 0;
        const Readings readings = m_readings.at(i, in_air);
        const double level_m = m_input.level_m.size() > 0 ? m_input.level_m(i) : nan;
        out.state = unknown(m_input.time_s(i), level_m, in_air);
        if (m_input.level_m.size() > 0 && std::isnan(level_m)) {
            out.state.stratification = "no water level";
            return out;
        }
        const Eigen::Index known = (!readings.value_degC.isNaN()).count();
        if (known < 3 || 2 * known < readings.value_degC.size()) {
            out.state.stratification = "too few readings";
            return out;
        }
        // The generator belongs to the time, so that threads change nothing.
        std::mt19937_64 random{static_cast<std::uint64_t>(i) + 1};
        out.fitted = m_fitter.fit(readings, random);
        if (std::isnan(out.fitted.mean_degC(0))) {
            out.state.stratification = "no profile fits";
            return out;
        }
        const double bottom_m = readings.depth_m(readings.depth_m.size() - 1);
        out.nodes = std::min<Eigen::Index>(
            out.fitted.depth_m.size(),
            static_cast<Eigen::Index>(std::lround(bottom_m / m_fitter.step_m())) + 1);
        fill(out, bottom_m, i);
        return out;
    }

    void fill(Instant& out, double bottom_m, Eigen::Index i) const {
        ColumnState& s = out.state;
        const Eigen::Index m = out.nodes;
        const Eigen::ArrayXd depth_m = out.fitted.depth_m.head(m);
        const Profile raw = profile_of(depth_m, out.fitted.mean_degC.head(m));
        const Hypsograph lake = this->lake(bottom_m);
        s.surface_c = raw.temperature_degC(0);
        s.bottom_c = raw.temperature_degC(m - 1);
        const bool inverse = s.surface_c < s.bottom_c - 0.05 &&
                             s.surface_c < heat::densest_degC(m_input.config.salinity_gkg, 0.0);
        Profile shown;
        const Figures best = figures(raw, lake, inverse, shown);
        spread(out, best, lake, inverse);
        s.schmidt_stability_jm2 = best.stability;
        s.heat_content_jm2 = best.heat;
        const TemperatureStep step = steepest_temperature(shown);
        s.max_gradient_cm = step.gradient_K_m;
        s.temperature_step_depth_m = step.depth_m;
        s.buoyancy_frequency_max_s1 = buoyancy_frequency_max_1_s(shown);
        s.max_density_gradient = s.buoyancy_frequency_max_s1 * s.buoyancy_frequency_max_s1 *
                                 shown.density_kg_m3.mean() / heat::standard_gravity_m_s2;
        const bool layered = !std::isnan(s.thermocline_depth_m);
        s.stratification = layered ? (inverse ? "inverse" : "stratified") : "mixed";
        if (layered)
            wind_numbers(s, shown, lake, i);
    }

    /// The reported figures and their sd from what the data allow.
    void spread(Instant& out, const Figures& best, const Hypsograph& lake, bool inverse) const {
        ColumnState& s = out.state;
        double n_thermocline = 0.0, n_mixed = 0.0, thermocline = 0.0, mixed = 0.0, stability = 0.0,
               heat = 0.0;
        const auto add = [](double& sum, double& n, double value, double about) {
            if (std::isnan(value))
                return;
            n += 1.0;
            sum += std::isnan(about) ? 0.0 : (value - about) * (value - about);
        };
        double all = 0.0;
        for (Eigen::Index c = 0; c < out.fitted.draws_degC.cols(); ++c) {
            Profile shown;
            const Profile draw = profile_of(out.fitted.depth_m.head(out.nodes),
                                            out.fitted.draws_degC.col(c).head(out.nodes));
            const Figures f = figures(draw, lake, inverse, shown);
            add(thermocline, n_thermocline, f.thermocline.depth_m, best.thermocline.depth_m);
            add(mixed, n_mixed, f.mixed_layer_m, best.mixed_layer_m);
            add(stability, all, f.stability, best.stability);
            heat += (f.heat - best.heat) * (f.heat - best.heat);
        }
        if (!std::isnan(best.thermocline.depth_m) && n_thermocline >= 0.5 * n_draws) {
            s.thermocline_depth_m = best.thermocline.depth_m;
            s.thermocline_depth_sd_m = std::sqrt(thermocline / n_thermocline);
            s.metalimnion_top_m = best.thermocline.top_m;
            s.metalimnion_bottom_m = best.thermocline.bottom_m;
        }
        if (!std::isnan(best.mixed_layer_m) && n_mixed >= 0.5 * n_draws) {
            s.mixed_layer_depth_m = best.mixed_layer_m;
            s.mixed_layer_depth_sd_m = std::sqrt(mixed / n_mixed);
        }
        s.schmidt_stability_sd_jm2 = std::sqrt(stability / n_draws);
        s.heat_content_sd_jm2 = std::sqrt(heat / n_draws);
    }

    void wind_numbers(ColumnState& s, const Profile& profile, const Hypsograph& lake,
                      Eigen::Index i) const {
        if (m_input.wind_ms.size() == 0 || !m_input.lake || std::isnan(m_input.wind_ms(i)))
            return;
        const double wind =
            wind_at_10m_ms(std::max(0.0, m_input.wind_ms(i)), m_input.config.wind_height_m);
        double above = 0.0, n_above = 0.0, below = 0.0, n_below = 0.0;
        for (Eigen::Index k = 0; k < profile.depth_m.size(); ++k) {
            const bool upper = profile.depth_m(k) < s.thermocline_depth_m;
            (upper ? above : below) += profile.density_kg_m3(k);
            (upper ? n_above : n_below) += 1.0;
        }
        if (n_above == 0.0 || n_below == 0.0)
            return;
        const double rho = above / n_above;
        const double u2 = friction_velocity_squared_m2_s2(wind, rho);
        s.wedderburn_number =
            wedderburn_number(heat::standard_gravity_m_s2 * (below / n_below - rho) / rho,
                              s.thermocline_depth_m, u2, std::sqrt(lake.surface_m2()));
        s.lake_number = lake_number(s.schmidt_stability_jm2, s.thermocline_depth_m, rho, u2, lake);
    }

    void follow_isotherms(const std::vector<Instant>& instants, ColumnFindings& out) const {
        double low = std::numeric_limits<double>::infinity(), high = -low;
        for (const auto& instant : instants)
            if (instant.nodes > 0) {
                low = std::min(low, instant.fitted.mean_degC.head(instant.nodes).minCoeff());
                high = std::max(high, instant.fitted.mean_degC.head(instant.nodes).maxCoeff());
            }
        if (!(high > low))
            return;
        const double step = high - low > 24.0 ? 5.0 : (high - low > 10.0 ? 2.0 : 1.0);
        for (double level = std::ceil(low / step) * step; level <= high; level += step)
            for (const auto& instant : instants)
                for (Eigen::Index k = 1; k < instant.nodes; ++k) {
                    const double a = instant.fitted.mean_degC(k - 1) - level,
                                 b = instant.fitted.mean_degC(k) - level;
                    if ((a > 0.0) == (b > 0.0))
                        continue;
                    out.isotherms.push_back(
                        {instant.state.time_s, level,
                         instant.fitted.depth_m(k - 1) + m_fitter.step_m() * a / (a - b)});
                    break;
                }
    }

    /// Under twenty thousand points, evenly in time and depth.
    void thin_profiles(const std::vector<Instant>& instants, ColumnFindings& out) const {
        const double bottom_m = m_readings.deepest_m();
        const double step_m = std::max(0.25, bottom_m / 40.0);
        const auto a_profile = static_cast<std::size_t>(bottom_m / step_m) + 1;
        const std::size_t every = std::max<std::size_t>(1, instants.size() * a_profile / 20000 + 1);
        const double way = (m_input.config.direction == campaign::Direction::down ? 1.0 : -1.0) /
                           record::height_per_fibre(m_input.config.winding);
        for (std::size_t i = 0; i < instants.size(); i += every) {
            const Instant& instant = instants[i];
            for (double z = 0.0; z < bottom_m; z += step_m) {
                const auto k = static_cast<Eigen::Index>(std::lround(z / m_fitter.step_m()));
                if (k >= instant.nodes)
                    break;
                double below_datum_m = instant.fitted.depth_m(k), elevation_m = nan;
                if (m_input.config.datum_elevation_m) {
                    const double level_m = std::isnan(instant.state.level_m)
                                               ? *m_input.config.datum_elevation_m
                                               : instant.state.level_m;
                    elevation_m = level_m - instant.fitted.depth_m(k);
                    below_datum_m = *m_input.config.datum_elevation_m - elevation_m;
                }
                out.profiles.push_back({instant.state.time_s, instant.fitted.depth_m(k),
                                        instant.fitted.mean_degC(k), instant.fitted.sd_K(k),
                                        elevation_m,
                                        m_input.config.datum_fibre_m + way * below_datum_m});
            }
        }
    }

    void follow_motion(const std::vector<Instant>& instants, ColumnFindings& out) const {
        const auto n = static_cast<Eigen::Index>(instants.size());
        Eigen::ArrayXd depth(n);
        Eigen::Index nodes = std::numeric_limits<Eigen::Index>::max();
        double thermocline = 0.0, layered = 0.0;
        std::vector<Eigen::Index> known;
        for (Eigen::Index i = 0; i < n; ++i) {
            const Instant& instant = instants[static_cast<std::size_t>(i)];
            depth(i) = instant.state.thermocline_depth_m;
            if (instant.nodes == 0)
                continue;
            known.push_back(i);
            nodes = std::min(nodes, instant.nodes);
            if (!std::isnan(depth(i))) {
                thermocline += depth(i);
                layered += 1.0;
            }
        }
        out.internal_wave_period_h = peak_period_h(m_input.time_s, depth);
        out.overturn_s = overturns(out.series, m_input.bin_s);
        if (known.size() < 20 || layered < 0.6 * static_cast<double>(known.size()))
            return;
        const Eigen::Index every = std::max<Eigen::Index>(1, nodes / 60);
        Eigen::ArrayXXd t(static_cast<Eigen::Index>(known.size()), nodes / every);
        Eigen::ArrayXd time_s(t.rows()), depth_m(t.cols());
        for (Eigen::Index r = 0; r < t.rows(); ++r) {
            const Instant& instant =
                instants[static_cast<std::size_t>(known[static_cast<std::size_t>(r)])];
            time_s(r) = instant.state.time_s;
            for (Eigen::Index k = 0; k < t.cols(); ++k) {
                t(r, k) = instant.fitted.mean_degC(k * every);
                depth_m(k) = instant.fitted.depth_m(k * every);
            }
        }
        out.diffusivity = flux_gradient(time_s, depth_m, t, lake(depth_m(depth_m.size() - 1)),
                                        thermocline / layered + 1.0);
    }

    void describe(ColumnFindings& out) const {
        const campaign::Column& c = m_input.config;
        out.height_per_fibre = record::height_per_fibre(c.winding);
        out.kernel_sd_m = m_readings.kernel_sd_m();
        out.density_source = heat::lake_density_source(c.salinity_gkg);
        out.stability_area = m_input.lake ? "per area of the lake's surface, by the hypsograph"
                                          : "along the mast, as of a column of constant area down "
                                            "to its deepest channel";
        out.method =
            "Profiles were fitted to means of " + text::number(m_input.bin_s) +
            " s as smoothing splines seen through the fibre's averaging (a Gaussian of " +
            text::fixed(out.kernel_sd_m, 3) +
            " m sd in the vertical), with the stiffness from the marginal likelihood (Wahba 1978; "
            "Pintore et al. 2006) and densities from " +
            out.density_source +
            "; the thermocline is the steepest density gradient at a scale of 0.5 m below 1.5 m, "
            "missing under 0.1 kg m-4 (0.01 under inverse stratification); the mixed layer ends "
            "where density is 0.1 kg m-3 over that of 0.1 to 0.4 m; stability after Schmidt (1928) "
            "and Idso (1973), " +
            out.stability_area + "." +
            (m_input.wind_ms.size() > 0 && m_input.lake
                 ? " Wind, taken at " + text::number(c.wind_height_m) +
                       " m, was brought to 10 m by the logarithmic law; drag 0.0010 under 5 m/s "
                       "and "
                       "0.0013 above (Hicks 1972); fetch is the square root of the surface's area."
                 : "");
    }

    void warn(ColumnFindings& out) const {
        std::size_t unknown = 0;
        int most_in_air = 0;
        for (const auto& state : out.series) {
            if (std::isnan(state.surface_c))
                ++unknown;
            most_in_air = std::max(most_in_air, state.channels_in_air);
        }
        const std::string name = "column '" + m_input.config.name + "': ";
        if (unknown == out.series.size())
            throw DataError{name + "at no time is there a water level and enough readings under "
                                   "water; check the level's times and the datum"};
        if (unknown > 0)
            out.warnings.push_back(
                {"column-unknown-times", name + std::to_string(unknown) + " of " +
                                             std::to_string(out.series.size()) +
                                             " times have no water level or too few readings"});
        if (most_in_air > 0)
            out.warnings.push_back(
                {"column-channels-in-air", name + "up to " + std::to_string(most_in_air) +
                                               " channels stand above the water and are left out"});
        if (m_input.wind_ms.size() > 0 && !m_input.lake)
            out.warnings.push_back({"column-wind-without-hypsograph",
                                    name + "a wind series without a hypsograph gives no Lake or "
                                           "Wedderburn Number; add hypsograph"});
    }

    const ColumnInput& m_input;
    ReadingMaker m_readings;
    ProfileFitter m_fitter;
};

} // namespace

ColumnFindings interpret(const ColumnInput& input) {
    return Interpreter{input}.run();
}

} // namespace rillstrand::column

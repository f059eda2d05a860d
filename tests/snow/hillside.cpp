// SPDX-License-Identifier: Apache-2.0
#include "hillside.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numbers>
#include <random>

namespace rillstrand::hillside {

namespace {

constexpr double day_s = 86400.0, step_s = 3600.0;
constexpr double stefan_boltzmann = 5.670374e-8, freezing_K = 273.15, fusion_J_kg = 3.34e5;

struct Sky {
    std::vector<double> air_degC, cloud, sun_W_m2, wind_ms, rain_mm_h, snow_mm_h;
};

struct Span {
    double first_s, days, start_swe_mm;
};

Span span_of(Season season) {
    switch (season) {
    case Season::melt_out:
        return {1'931'558'400.0, 85.0, 220.0}; // from 2031-03-18
    case Season::whole_winter:
        return {1'918'252'800.0, 225.0, 0.0}; // from 2030-10-15
    case Season::thin_and_grey:
        break;
    }
    return {1'919'808'000.0, 80.0, 0.0}; // from 2030-11-02
}

double day_of_year(double time_s) {
    return std::fmod(time_s / day_s, 365.2425) + 1.0;
}

/// Clear-sky sun on level ground: Bouguer-Lambert with a transmittance of 0.74.
double clear_sun_W_m2(double time_s, double latitude_deg, double longitude_deg) {
    constexpr double pi = std::numbers::pi;
    const double declination = -0.4093 * std::cos(2.0 * pi * (day_of_year(time_s) + 10.0) / 365.25);
    const double hour = std::fmod(time_s + 240.0 * longitude_deg, day_s) / 3600.0;
    const double latitude = latitude_deg * pi / 180.0;
    const double up =
        std::sin(latitude) * std::sin(declination) +
        std::cos(latitude) * std::cos(declination) * std::cos((hour - 12.0) * pi / 12.0);
    return up > 0.02 ? 1361.0 * up * std::pow(0.74, 1.0 / (up + 0.05)) : 0.0;
}

class Weather {
public:
    Weather(const Setup& setup, const Span& span, std::mt19937_64& random)
        : m_setup{setup}, m_span{span}, m_random{random} {}

    Sky make(double& grey_from_s, double& grey_to_s) {
        const auto days = static_cast<int>(m_span.days) + 1;
        const int grey = days / 3 + static_cast<int>(10.0 * uniform());
        const bool has_grey = m_setup.season == Season::thin_and_grey;
        if (has_grey) {
            grey_from_s = m_span.first_s + grey * day_s;
            grey_to_s = grey_from_s + 8.0 * day_s;
        }
        double synoptic = 0.0, wet = 0.0;
        const double warmth = 3.0 * (uniform() - 0.5);
        Sky sky;
        for (int d = 0; d < days; ++d) {
            const bool in_grey = has_grey && d >= grey && d < grey + 8;
            synoptic = 0.72 * synoptic + 3.0 * normal();
            wet = 0.55 * wet + normal();
            const double time_s = m_span.first_s + d * day_s;
            double mean =
                2.5 + warmth -
                10.0 * std::cos(2.0 * std::numbers::pi * (day_of_year(time_s) - 20.0) / 365.25);
            if (m_setup.season == Season::thin_and_grey)
                mean = 0.5 + warmth - 0.04 * d;
            double cloud = std::clamp(0.5 + 0.38 * wet, 0.0, 1.0);
            double storm_mm = cloud > 0.8 && uniform() < 0.55 ? 14.0 * -std::log(uniform()) : 0.0;
            if (has_grey) {
                storm_mm *= 0.35;
                if (in_grey) {
                    synoptic = 0.6 * synoptic;
                    mean = -4.0;
                    cloud = 0.97;
                    storm_mm = 0.0;
                }
                if (d > grey - 6 && d < grey)
                    mean += 6.0, storm_mm = 0.0;
            }
            add_day(sky, time_s, mean + synoptic, cloud, storm_mm, in_grey);
        }
        return sky;
    }

private:
    double uniform() { return std::uniform_real_distribution<>{1e-9, 1.0}(m_random); }
    double normal() { return std::normal_distribution<>{}(m_random); }

    void add_day(Sky& sky, double time_s, double mean, double cloud, double storm_mm, bool grey) {
        const double begin = 24.0 * uniform(), length = 3.0 + 14.0 * uniform();
        const double swing = (grey ? 0.4 : 1.0 + 4.5 * (1.0 - cloud));
        const double wind = 1.0 + 2.5 * uniform();
        for (int h = 0; h < 24; ++h) {
            const double t = time_s + (h + 0.5) * 3600.0;
            const double hour = std::fmod(t + 240.0 * m_setup.longitude_deg, day_s) / 3600.0;
            const double last = sky.air_degC.empty() ? mean : sky.air_degC.back();
            const double goal = mean + swing * std::cos((hour - 15.0) * std::numbers::pi / 12.0);
            const double air = last + 0.35 * (goal - last) + (grey ? 0.1 : 0.25) * normal();
            const double sky_cloud = std::clamp(cloud + 0.08 * normal(), 0.0, 1.0);
            const bool storm = storm_mm > 0.0 && h >= begin && h < begin + length;
            const double falls = storm ? storm_mm / length : 0.0;
            sky.air_degC.push_back(air);
            sky.cloud.push_back(sky_cloud);
            // Kasten and Czeplak (1980): 1 - 0.75 n^3.4.
            sky.sun_W_m2.push_back(clear_sun_W_m2(t, m_setup.latitude_deg, m_setup.longitude_deg) *
                                   (1.0 - 0.75 * std::pow(sky_cloud, 3.4)));
            sky.wind_ms.push_back(wind * (0.8 + 0.4 * uniform()));
            sky.snow_mm_h.push_back(air < 1.0 ? falls : 0.0);
            sky.rain_mm_h.push_back(air < 1.0 ? 0.0 : falls);
        }
    }

    const Setup& m_setup;
    const Span& m_span;
    std::mt19937_64& m_random;
};

/// What makes one place differ from the next.
struct Place {
    double sun = 1.0;   ///< share of the open sun that comes through
    double sky = 1.0;   ///< share of the hemisphere that is open sky
    double wind = 1.0;  ///< share of the open wind
    double drift = 1.0; ///< snow that stays, of what falls
    double conductivity = 1.5, capacity = 2.2e6, water = 0.2;
};

Place place_of(Terrain terrain, std::mt19937_64& random) {
    const auto vary = [&](double middle, double sd) {
        return middle * std::exp(sd * std::normal_distribution<>{}(random));
    };
    Place p;
    switch (terrain) {
    case Terrain::open:
        p = {vary(1.0, 0.12), 0.95, 1.0, vary(1.0, 0.2)};
        break;
    case Terrain::ridge:
        p = {vary(1.1, 0.08), 1.0, vary(1.6, 0.1), vary(0.2, 0.5)};
        break;
    case Terrain::gully:
        p = {vary(0.7, 0.15), 0.8, 0.6, vary(2.0, 0.25)};
        break;
    case Terrain::forest:
        p = {vary(0.25, 0.3), 0.3, 0.35, vary(0.6, 0.2)};
        break;
    case Terrain::tree_well:
        p = {vary(0.2, 0.3), 0.15, 0.3, vary(0.25, 0.35)};
        break;
    }
    p.conductivity = vary(1.3, 0.25);
    p.capacity = vary(2.1e6, 0.12);
    p.water = std::clamp(vary(0.15, 0.4), 0.02, 0.4);
    return p;
}

/// One column of snow over ground, stepped by an implicit scheme.
class Column {
public:
    Column(const Place& place, double start_swe_mm, double ground_degC)
        : m_place{place}, m_swe{start_swe_mm}, m_density{start_swe_mm > 0.0 ? 330.0 : 120.0} {
        for (std::size_t i = 0; i < ground_nodes; ++i) {
            m_thickness[i] = 0.008 * std::pow(1.42, static_cast<double>(i));
            m_ground[i] = start_swe_mm > 0.0 ? 0.1 + 0.15 * static_cast<double>(i) : ground_degC;
        }
        m_snow.fill(start_swe_mm > 0.0 ? -1.0 : 0.0);
    }

    void step(double air, double sun, double cloud, double wind, double rain, double snow) {
        fall(air, snow);
        const double depth = depth_m();
        const bool covered = m_swe > least_swe_mm;
        const double through = covered ? std::exp(-depth / 0.03) : 1.0;
        const double albedo = covered ? m_albedo * (1.0 - through) + 0.18 * through : 0.18;
        const double shine = sun * m_place.sun;
        const double exchange = 4.0 + 4.5 * wind * m_place.wind;
        const double air_K = air + freezing_K;
        const double clear = 0.72 + 0.005 * air;
        const double emits = clear + (0.97 - clear) * cloud * cloud;
        const double from_sky = stefan_boltzmann * std::pow(air_K, 4) *
                                (m_place.sky * emits + (1.0 - m_place.sky) * 0.98);
        const double top = covered ? m_snow[0] : m_ground[0];
        const double top_K = top + freezing_K;
        const double slope = 4.0 * 0.98 * stefan_boltzmann * std::pow(top_K, 3);
        const double gives = 0.98 * stefan_boltzmann * std::pow(top_K, 4);
        const double latent = covered ? 0.0 : 0.25 * shine * (1.0 - albedo); // wet ground dries
        const double at_top = shine * (1.0 - albedo) * (covered ? 1.0 - through : 1.0) - latent;
        const double to_ground = covered ? shine * 0.82 * through : 0.0;
        // flux into the top node: a - b T_top
        const double b = exchange + slope;
        const double a = at_top + from_sky - gives + slope * top + exchange * air +
                         rain * 4186.0 / 3600.0 * std::max(air, 0.0);
        solve(a, b, to_ground, covered, depth);
        melt(rain, a, b);
    }

    double depth_m() const { return m_swe / m_density; }

    double at(double burial_m, double air) const {
        if (burial_m <= 0.0)
            return 0.8 * m_ground[0] + 0.2 * (m_swe > least_swe_mm ? m_snow.back() : air);
        double depth = 0.0;
        for (std::size_t i = 0; i + 1 < ground_nodes; ++i) {
            const double here = depth + 0.5 * m_thickness[i];
            const double next = depth + m_thickness[i] + 0.5 * m_thickness[i + 1];
            if (burial_m < next)
                return m_ground[i] + (m_ground[i + 1] - m_ground[i]) *
                                         std::clamp((burial_m - here) / (next - here), 0.0, 1.0);
            depth += m_thickness[i];
        }
        return m_ground.back();
    }

private:
    static constexpr std::size_t snow_nodes = 4, ground_nodes = 13;
    static constexpr double least_swe_mm = 1.0;

    void fall(double air, double snow) {
        const double stays = snow * m_place.drift;
        if (stays > 0.0) {
            if (m_swe <= least_swe_mm) {
                m_snow.fill(std::min(air, m_ground[0]));
                m_density = 110.0;
            }
            m_density = (m_swe + stays) / (m_swe / m_density + stays / 110.0);
            m_swe += stays;
            m_albedo = std::min(0.86, m_albedo + 0.02 * stays);
        }
        const double goal = m_snow[0] > -0.2 ? 480.0 : 320.0;
        m_density += (goal - m_density) * (m_snow[0] > -0.2 ? 0.004 : 0.0009);
        m_albedo = std::max(0.5, m_albedo - (m_snow[0] > -0.2 ? 0.0025 : 0.0004));
    }

    /// Apparent heat capacity: water freezes between -0.4 and 0 degC.
    double capacity(std::size_t i) const {
        const bool freezes = m_ground[i] > -0.4 && m_ground[i] < 0.0;
        return m_place.capacity + (freezes ? m_place.water * 1000.0 * fusion_J_kg / 0.4 : 0.0);
    }

    void solve(double a, double b, double to_ground, bool covered, double depth) {
        const std::size_t first = covered ? 0 : snow_nodes;
        constexpr std::size_t n = snow_nodes + ground_nodes;
        std::array<double, n> heat{}, resist{}, t{}, lower{}, diagonal{}, upper{}, right{};
        // Sturm et al. (1997), J. Glaciol. 43, 26-41.
        const double rho = m_density / 1000.0;
        const double k_snow =
            rho < 0.156 ? 0.023 + 0.234 * rho : 0.138 - 1.01 * rho + 3.233 * rho * rho;
        for (std::size_t i = 0; i < snow_nodes; ++i) {
            const double thick = std::max(depth, 0.002) / static_cast<double>(snow_nodes);
            heat[i] = m_density * 2100.0 * thick / step_s;
            resist[i] = 0.5 * thick / k_snow;
            t[i] = m_snow[i];
        }
        for (std::size_t i = 0; i < ground_nodes; ++i) {
            heat[snow_nodes + i] = capacity(i) * m_thickness[i] / step_s;
            resist[snow_nodes + i] = 0.5 * m_thickness[i] / m_place.conductivity;
            t[snow_nodes + i] = m_ground[i];
        }
        for (std::size_t i = first; i < n; ++i) {
            diagonal[i] = heat[i];
            right[i] = heat[i] * t[i];
            if (i > first) {
                lower[i] = -1.0 / (resist[i - 1] + resist[i]);
                diagonal[i] -= lower[i];
            }
            if (i + 1 < n) {
                upper[i] = -1.0 / (resist[i] + resist[i + 1]);
                diagonal[i] -= upper[i];
            }
        }
        diagonal[first] += b;
        right[first] += a;
        right[snow_nodes] += to_ground;
        right[n - 1] += 0.06;
        for (std::size_t i = first + 1; i < n; ++i) {
            const double w = lower[i] / diagonal[i - 1];
            diagonal[i] -= w * upper[i - 1];
            right[i] -= w * right[i - 1];
        }
        t[n - 1] = right[n - 1] / diagonal[n - 1];
        for (std::size_t i = n - 1; i-- > first;)
            t[i] = (right[i] - upper[i] * t[i + 1]) / diagonal[i];
        m_excess_J_m2 = 0.0;
        for (std::size_t i = first; i < snow_nodes; ++i) {
            if (t[i] > 0.0) {
                m_excess_J_m2 += heat[i] * step_s * t[i];
                t[i] = 0.0;
            }
            m_snow[i] = t[i];
        }
        for (std::size_t i = 0; i < ground_nodes; ++i)
            m_ground[i] = t[snow_nodes + i];
        // Ground under snow that is above zero melts it from below.
        if (covered && m_ground[0] > 0.0) {
            m_excess_J_m2 += m_ground[0] * capacity(0) * m_thickness[0];
            m_ground[0] = 0.0;
        }
        m_was_covered = covered;
    }

    void melt(double rain, double a, double b) {
        if (!m_was_covered)
            return;
        if (m_snow[0] >= 0.0)
            m_excess_J_m2 += std::max(0.0, a) * step_s; // a top held at 0 degC takes all of it
        (void)b;
        double water_mm = std::min(m_swe, m_excess_J_m2 / fusion_J_kg);
        m_swe -= water_mm;
        water_mm += rain;
        // Water that comes upon cold snow freezes there and warms it.
        const double node_mm = m_swe / static_cast<double>(snow_nodes);
        for (double& t : m_snow) {
            const double lacks_mm = -t * 2100.0 * node_mm / fusion_J_kg;
            const double freezes = std::min(std::max(0.0, lacks_mm), water_mm);
            if (lacks_mm > 0.0)
                t *= 1.0 - freezes / lacks_mm;
            water_mm -= freezes;
            m_swe += freezes;
        }
    }

    Place m_place;
    double m_swe, m_density, m_albedo = 0.75, m_excess_J_m2 = 0.0;
    bool m_was_covered = false;
    std::array<double, snow_nodes> m_snow{};
    std::array<double, ground_nodes> m_ground{}, m_thickness{};
};

std::vector<Terrain> lay_terrain(const Setup& setup, std::mt19937_64& random) {
    const std::array kinds{Terrain::open, Terrain::ridge, Terrain::gully, Terrain::forest};
    std::vector<Terrain> terrain;
    while (terrain.size() < static_cast<std::size_t>(setup.channels)) {
        const Terrain kind = kinds[std::uniform_int_distribution<std::size_t>{0, 3}(random)];
        const int length = std::uniform_int_distribution<>{4, 14}(random);
        for (int i = 0; i < length; ++i)
            terrain.push_back(kind == Terrain::forest &&
                                      std::uniform_real_distribution<>{}(random) < 0.2
                                  ? Terrain::tree_well
                                  : kind);
    }
    terrain.resize(static_cast<std::size_t>(setup.channels));
    return terrain;
}

/// The instrument's response blurs along the fibre: a triangle of that full width.
Eigen::ArrayXXd blurred(const Eigen::ArrayXXd& exact, const Setup& setup) {
    if (setup.response_m <= setup.spacing_m * 0.5)
        return exact;
    const int reach = static_cast<int>(setup.response_m / setup.spacing_m);
    Eigen::ArrayXXd result = Eigen::ArrayXXd::Zero(exact.rows(), exact.cols());
    for (Eigen::Index j = 0; j < exact.cols(); ++j) {
        double sum = 0.0;
        for (int k = -reach; k <= reach; ++k) {
            const double w = 1.0 - std::abs(k) * setup.spacing_m / (setup.response_m + 0.5);
            const Eigen::Index from = std::clamp<Eigen::Index>(j + k, 0, exact.cols() - 1);
            if (w > 0.0) {
                result.col(j) += w * exact.col(from);
                sum += w;
            }
        }
        result.col(j) /= sum;
    }
    return result;
}

} // namespace

Hillside make_hillside(const Setup& setup) {
    std::mt19937_64 random{setup.seed * 7919U + 17U};
    const Span span = span_of(setup.season);
    Hillside h;
    const Sky sky = Weather{setup, span, random}.make(h.grey_from_s, h.grey_to_s);
    h.terrain = lay_terrain(setup, random);
    const auto n = static_cast<Eigen::Index>(setup.channels);
    const auto steps = static_cast<Eigen::Index>(span.days * 24.0);
    Eigen::ArrayXXd exact(steps, n);
    h.depth_m.resize(steps, n);
    h.interval_s = step_s;
    h.time_s =
        Eigen::ArrayXd::LinSpaced(steps, span.first_s + 0.5 * step_s,
                                  span.first_s + (static_cast<double>(steps) - 0.5) * step_s);
    h.fibre_m =
        Eigen::ArrayXd::LinSpaced(n, 100.0, 100.0 + setup.spacing_m * static_cast<double>(n - 1));
    h.air_degC.resize(steps);
    h.cloud.resize(steps);
    for (Eigen::Index j = 0; j < n; ++j) {
        const Place place = place_of(h.terrain[static_cast<std::size_t>(j)], random);
        Column column{place, span.start_swe_mm * place.drift, 7.0};
        for (Eigen::Index i = 0; i < steps; ++i) {
            const auto s = static_cast<std::size_t>(i);
            column.step(sky.air_degC[s], sky.sun_W_m2[s], sky.cloud[s], sky.wind_ms[s],
                        sky.rain_mm_h[s], sky.snow_mm_h[s]);
            exact(i, j) = column.at(setup.burial_depth_m, sky.air_degC[s]);
            h.depth_m(i, j) = static_cast<float>(column.depth_m());
            h.air_degC(i) = sky.air_degC[s];
            h.cloud(i) = sky.cloud[s];
        }
    }
    const Eigen::ArrayXXd seen = blurred(exact, setup);
    std::normal_distribution<> noise{0.0, setup.noise_K};
    h.temperature_degC.resize(steps, n);
    for (Eigen::Index i = 0; i < steps; ++i)
        for (Eigen::Index j = 0; j < n; ++j)
            h.temperature_degC(i, j) =
                static_cast<float>(seen(i, j) + setup.bias_K + noise(random));
    if (setup.missing_fraction > 0.0)
        for (Eigen::Index i = 0; i + 24 <= steps; i += 24)
            if (std::uniform_real_distribution<>{}(random) < setup.missing_fraction)
                h.temperature_degC.middleRows(i, 24) = std::numeric_limits<float>::quiet_NaN();
    return h;
}

} // namespace rillstrand::hillside

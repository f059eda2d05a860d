// SPDX-License-Identifier: Apache-2.0
#include "column/structure.hpp"

#include "heat/water.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <vector>

namespace rillstrand::column {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Change of a quantity over the scale around each node of an even grid, per metre; NaN where the
/// scale does not fit in or the node is too shallow.
Eigen::ArrayXd gradient(const Profile& profile, const Eigen::ArrayXd& values) {
    const Eigen::Index n = values.size();
    Eigen::ArrayXd slope = Eigen::ArrayXd::Constant(n, nan);
    if (n < 3)
        return slope;
    const double step_m = profile.depth_m(1) - profile.depth_m(0);
    const auto half = std::max<Eigen::Index>(1, std::lround(0.5 * gradient_scale_m / step_m));
    for (Eigen::Index i = half; i + half < n; ++i)
        if (profile.depth_m(i) >= gradient_from_m - 1e-9)
            slope(i) = (values(i + half) - values(i - half)) /
                       (profile.depth_m(i + half) - profile.depth_m(i - half));
    return slope;
}

Eigen::Index steepest(const Eigen::ArrayXd& slope) {
    Eigen::Index best = -1;
    for (Eigen::Index i = 0; i < slope.size(); ++i)
        if (!std::isnan(slope(i)) && (best < 0 || slope(i) > slope(best)))
            best = i;
    return best;
}

/// Top of the parabola through a node and its neighbours.
double refined_m(const Profile& profile, const Eigen::ArrayXd& slope, Eigen::Index i) {
    if (i == 0 || i + 1 >= slope.size() || std::isnan(slope(i - 1)) || std::isnan(slope(i + 1)))
        return profile.depth_m(i);
    const double bend = slope(i - 1) - 2.0 * slope(i) + slope(i + 1);
    if (!(bend < 0.0))
        return profile.depth_m(i);
    const double off = std::clamp(0.5 * (slope(i - 1) - slope(i + 1)) / bend, -0.5, 0.5);
    return profile.depth_m(i) + off * (profile.depth_m(i + 1) - profile.depth_m(i));
}

/// Where the gradient falls under a threshold beyond node i, going by `way`.
double edge_m(const Profile& profile, const Eigen::ArrayXd& slope, Eigen::Index i, int way,
              double least) {
    Eigen::Index k = i;
    while (k + way >= 0 && k + way < slope.size() && slope(k + way) >= least)
        k += way;
    const Eigen::Index beyond = k + way;
    if (beyond < 0 || beyond >= slope.size() || std::isnan(slope(beyond)))
        return profile.depth_m(k);
    const double w = (slope(k) - least) / (slope(k) - slope(beyond));
    return profile.depth_m(k) + w * (profile.depth_m(beyond) - profile.depth_m(k));
}

/// Integral over depth of f(z, value) A(z), with linear value and area between nodes: Simpson's
/// rule on pieces that end at every node of both.
template <class Function>
double integrate(const Eigen::ArrayXd& depth_m, const Eigen::ArrayXd& value, const Hypsograph& lake,
                 const Function& function) {
    const double bottom_m = lake.bottom_m();
    double sum = 0.0;
    const auto piece = [&](double from_m, double to_m, double from, double to) {
        const double end_m = std::min(to_m, bottom_m);
        if (end_m <= from_m)
            return;
        const double end = from + (to - from) * (end_m - from_m) / (to_m - from_m);
        const auto& levels = lake.depths_m();
        double a = from_m, va = from;
        const double* next = std::upper_bound(levels.data(), levels.data() + levels.size(), from_m);
        while (a < end_m) {
            double b = end_m;
            if (next != levels.data() + levels.size() && *next < end_m)
                b = *next++;
            const double vb = from + (end - from) * (b - from_m) / (end_m - from_m);
            const double middle = 0.5 * (a + b);
            sum += (b - a) / 6.0 *
                   (function(a, va) * lake.area_m2(a) +
                    4.0 * function(middle, 0.5 * (va + vb)) * lake.area_m2(middle) +
                    function(b, vb) * lake.area_m2(b));
            a = b;
            va = vb;
        }
    };
    const Eigen::Index last = depth_m.size() - 1;
    piece(0.0, depth_m(0), value(0), value(0));
    for (Eigen::Index i = 0; i < last; ++i)
        piece(depth_m(i), depth_m(i + 1), value(i), value(i + 1));
    piece(depth_m(last), bottom_m, value(last), value(last));
    return sum;
}

} // namespace

Eigen::ArrayXd densities(const Eigen::ArrayXd& temperature_degC, double salinity_gkg) {
    return temperature_degC.unaryExpr(
        [&](double t) { return heat::lake_density_kg_m3(Celsius::from_degC(t), salinity_gkg); });
}

Eigen::ArrayXd settled(const Eigen::ArrayXd& density_kg_m3) {
    struct Pool {
        double mean;
        Eigen::Index n;
    };
    std::vector<Pool> pools;
    for (const double value : density_kg_m3) {
        pools.push_back({value, 1});
        while (pools.size() > 1 && pools[pools.size() - 2].mean > pools.back().mean) {
            const Pool last = pools.back();
            pools.pop_back();
            Pool& into = pools.back();
            const auto a = static_cast<double>(into.n), b = static_cast<double>(last.n);
            into.mean = (a * into.mean + b * last.mean) / (a + b);
            into.n += last.n;
        }
    }
    Eigen::ArrayXd out(density_kg_m3.size());
    Eigen::Index i = 0;
    for (const Pool& pool : pools) {
        out.segment(i, pool.n).setConstant(pool.mean);
        i += pool.n;
    }
    return out;
}

Thermocline thermocline(const Profile& profile, bool inverse) {
    const double least = inverse ? least_inverse_gradient_kg_m4 : least_gradient_kg_m4;
    const Eigen::ArrayXd slope = gradient(profile, profile.density_kg_m3);
    const Eigen::Index i = steepest(slope);
    if (i < 0 || slope(i) < least)
        return {nan, nan, nan, nan};
    return {refined_m(profile, slope, i), slope(i), edge_m(profile, slope, i, -1, least),
            edge_m(profile, slope, i, 1, least)};
}

TemperatureStep steepest_temperature(const Profile& profile) {
    const Eigen::ArrayXd slope = gradient(profile, profile.temperature_degC).abs();
    const Eigen::Index i = steepest(slope);
    if (i < 0)
        return {nan, nan};
    return {refined_m(profile, slope, i), slope(i)};
}

double mixed_layer_depth_m(const Profile& profile) {
    double sum = 0.0, n = 0.0;
    for (Eigen::Index i = 0; i < profile.depth_m.size(); ++i)
        if (profile.depth_m(i) >= 0.1 - 1e-9 && profile.depth_m(i) <= 0.4 + 1e-9) {
            sum += profile.density_kg_m3(i);
            n += 1.0;
        }
    if (n == 0.0)
        return nan;
    const double limit = sum / n + mixed_step_kg_m3;
    for (Eigen::Index i = 1; i < profile.depth_m.size(); ++i) {
        const double above = profile.density_kg_m3(i - 1), below = profile.density_kg_m3(i);
        if (profile.depth_m(i) <= 0.4 || below < limit)
            continue;
        const double w =
            below > above ? std::clamp((limit - above) / (below - above), 0.0, 1.0) : 0.0;
        return profile.depth_m(i - 1) + w * (profile.depth_m(i) - profile.depth_m(i - 1));
    }
    return nan;
}

double buoyancy_frequency_max_1_s(const Profile& profile) {
    const Eigen::ArrayXd slope = gradient(profile, profile.density_kg_m3);
    const Eigen::Index i = steepest(slope);
    if (i < 0)
        return nan;
    return std::sqrt(std::max(0.0, slope(i)) * heat::standard_gravity_m_s2 /
                     profile.density_kg_m3(i));
}

double volume_centre_m(const Hypsograph& lake) {
    const Eigen::ArrayXd ends{{0.0, lake.bottom_m()}};
    const Eigen::ArrayXd one = Eigen::ArrayXd::Ones(2);
    const double volume = integrate(ends, one, lake, [](double, double v) { return v; });
    return integrate(ends, one, lake, [](double z, double v) { return z * v; }) / volume;
}

double schmidt_stability_J_m2(const Profile& profile, const Hypsograph& lake) {
    const double centre_m = volume_centre_m(lake);
    // Less a constant density, whose integral is nothing: fewer digits are lost.
    const Eigen::ArrayXd over = profile.density_kg_m3 - profile.density_kg_m3.mean();
    return heat::standard_gravity_m_s2 / lake.surface_m2() *
           integrate(profile.depth_m, over, lake,
                     [&](double z, double rho) { return (z - centre_m) * rho; });
}

double heat_content_J_m2(const Profile& profile, const Hypsograph& lake) {
    Eigen::ArrayXd heat_J_m3(profile.depth_m.size());
    for (Eigen::Index i = 0; i < heat_J_m3.size(); ++i) {
        const Celsius t = Celsius::from_degC(profile.temperature_degC(i));
        heat_J_m3(i) = profile.density_kg_m3(i) * heat::heat_capacity_J_kgK(t) * t.degC();
    }
    return integrate(profile.depth_m, heat_J_m3, lake, [](double, double v) { return v; }) /
           lake.surface_m2();
}

double friction_velocity_squared_m2_s2(double wind_10m_ms, double density_kg_m3) {
    const double drag = wind_10m_ms < 5.0 ? 1.0e-3 : 1.3e-3, air_kg_m3 = 1.2;
    return air_kg_m3 * drag * wind_10m_ms * wind_10m_ms / density_kg_m3;
}

double wind_at_10m_ms(double wind_ms, double height_m) {
    constexpr double roughness_m = 1.5e-4;
    return wind_ms * std::log(10.0 / roughness_m) / std::log(height_m / roughness_m);
}

double wedderburn_number(double reduced_gravity_m_s2, double upper_m, double u_star2_m2_s2,
                         double fetch_m) {
    return u_star2_m2_s2 > 0.0
               ? reduced_gravity_m_s2 * upper_m * upper_m / (u_star2_m2_s2 * fetch_m)
               : nan;
}

double lake_number(double stability_J_m2, double thermocline_m, double density_kg_m3,
                   double u_star2_m2_s2, const Hypsograph& lake) {
    if (!(u_star2_m2_s2 > 0.0))
        return nan;
    return stability_J_m2 * thermocline_m /
           (density_kg_m3 * u_star2_m2_s2 * std::sqrt(lake.surface_m2()) * volume_centre_m(lake));
}

} // namespace rillstrand::column

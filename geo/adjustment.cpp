// SPDX-License-Identifier: Apache-2.0
#include "adjustment.hpp"

#include "base/text.hpp"
#include "stats/path_smoother.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <utility>

namespace rillstrand::geo {

namespace {

/// A tie point is a blunder beyond so many sd of what the others say, and so many metres.
constexpr double blunder_sd = 5.0;
constexpr std::size_t enough_ties = 4;

/// Beliefs before any tie point, from what practice reports (practice of the trade, no source):
/// slack of 1 to 8 %, wandering by about 2 % in 100 m, taken up in jumps of decimetres.
stats::PathPrior route_prior() {
    return {0.955, 0.05, std::log(0.02), 1.0, std::log(0.3), 1.0, 100.0};
}

/// Without a route each coordinate's rate is the cosine of the direction, which turns freely.
stats::PathPrior free_prior() {
    return {0.0, 0.7, std::log(0.8), 1.0, std::log(1.5), 1.0, 100.0};
}

Eigen::ArrayXd gathered(const std::vector<Tie>& ties, const std::vector<std::size_t>& which,
                        double (*take)(const Tie&)) {
    Eigen::ArrayXd values(static_cast<Eigen::Index>(which.size()));
    for (std::size_t k = 0; k < which.size(); ++k)
        values(static_cast<Eigen::Index>(k)) = take(ties[which[k]]);
    return values;
}

/// The series to be smoothed: chainage on a route, else both coordinates.
std::vector<stats::PathData> series_of(const std::vector<Tie>& ties,
                                       const std::vector<std::size_t>& which, bool on_route) {
    const Eigen::ArrayXd at = gathered(ties, which, [](const Tie& t) { return t.path_m; });
    const Eigen::ArrayXd variance = gathered(
        ties, which, [](const Tie& t) { return t.sd_m * t.sd_m + t.path_sd_m * t.path_sd_m; });
    if (on_route)
        return {{at, gathered(ties, which, [](const Tie& t) { return t.measure_m; }), variance}};
    return {{at, gathered(ties, which, [](const Tie& t) { return t.xy.x(); }), variance},
            {at, gathered(ties, which, [](const Tie& t) { return t.xy.y(); }), variance}};
}

struct Expected {
    Eigen::ArrayXd miss_m; ///< surveyed minus expected (signed along a route)
    Eigen::ArrayXd z;      ///< in standard deviations
};

Expected expected_from_others(const std::vector<stats::PathData>& series,
                              const stats::PathPrior& prior,
                              const std::vector<stats::WeightedSize>& sizes) {
    Expected result{Eigen::ArrayXd::Zero(series[0].at.size()),
                    Eigen::ArrayXd::Zero(series[0].at.size())};
    Eigen::ArrayXd square = result.miss_m;
    for (const auto& data : series) {
        const stats::LeftOut left = stats::leave_one_out(data, prior, sizes);
        const Eigen::ArrayXd miss = data.value - left.predicted;
        square += miss.square();
        result.z += miss.square() / left.variance;
        if (series.size() == 1)
            result.miss_m = miss;
    }
    if (series.size() > 1)
        result.miss_m = square.sqrt();
    result.z = result.z.sqrt();
    return result;
}

double piece_cost(const Tie& a, const Tie& b, double measure_a, double measure_b,
                  double max_slack) {
    const double cable_m = b.path_m - a.path_m;
    const double ground_m = measure_b - measure_a;
    const double sd_m = std::hypot(std::hypot(a.sd_m, b.sd_m), 1.0);
    const double over = ground_m - cable_m, under = cable_m / max_slack - ground_m;
    const double miss = std::max({over, under, 0.0}) / sd_m;
    return std::min(miss * miss, 400.0);
}

/// Cheapest sequence of places for all ties; ties get theirs.
double match(const Polyline& route, std::vector<Tie>& ties, double max_slack) {
    constexpr double others_within_m = 25.0;
    std::vector<std::vector<Nearest>> places;
    std::vector<std::vector<double>> cost;
    std::vector<std::vector<std::size_t>> from;
    for (std::size_t i = 0; i < ties.size(); ++i) {
        places.push_back(route.near_places(ties[i].xy.x(), ties[i].xy.y(),
                                           others_within_m + 3.0 * ties[i].sd_m));
        cost.emplace_back();
        from.emplace_back();
        for (const auto& place : places.back()) {
            const double off = place.offset_m / std::hypot(ties[i].sd_m, 1.0);
            double best = 0.0;
            std::size_t which = 0;
            for (std::size_t k = 0; i > 0 && k < places[i - 1].size(); ++k) {
                const double here =
                    cost[i - 1][k] + piece_cost(ties[i - 1], ties[i], places[i - 1][k].measure_m,
                                                place.measure_m, max_slack);
                if (k == 0 || here < best) {
                    best = here;
                    which = k;
                }
            }
            cost.back().push_back(best + std::min(off * off, 100.0));
            from.back().push_back(which);
        }
    }
    std::size_t at = static_cast<std::size_t>(
        std::min_element(cost.back().begin(), cost.back().end()) - cost.back().begin());
    const double total = cost.back()[at];
    for (std::size_t i = ties.size(); i-- > 0;) {
        ties[i].measure_m = places[i][at].measure_m;
        ties[i].offset_m = places[i][at].offset_m;
        at = from[i][at];
    }
    return total;
}

} // namespace

Polyline match_to_route(const Polyline& route, std::vector<Tie>& ties, double max_slack) {
    std::vector<Tie> other_way = ties;
    Polyline turned = route.reversed();
    const double forward = match(route, ties, max_slack);
    const double backward = match(turned, other_way, max_slack);
    if (forward <= backward)
        return route;
    ties = other_way;
    return turned;
}

Adjustment::Adjustment(std::vector<Tie>& ties, std::optional<Polyline> route)
    : m_ties{ties}, m_route{std::move(route)} {
    if (m_route)
        set_aside_far_from_route();
    set_aside_blunders();
    if (used().size() < 2)
        throw DataError{"placement.tie_points: fewer than two tie points agree with each other; "
                        "check fibre distances and coordinates"};
    note_residuals();
    if (m_route) {
        // What the ties' offsets are wider than their sd is the route's own error.
        double extra = 0.0;
        const auto which = used();
        for (const std::size_t i : which)
            extra += m_ties[i].offset_m * m_ties[i].offset_m - m_ties[i].sd_m * m_ties[i].sd_m;
        m_across_variance = std::max(0.0, extra / static_cast<double>(which.size()));
    }
}

std::vector<std::size_t> Adjustment::used() const {
    std::vector<std::size_t> which;
    for (std::size_t i = 0; i < m_ties.size(); ++i)
        if (m_ties[i].used)
            which.push_back(i);
    return which;
}

void Adjustment::set_aside_far_from_route() {
    std::vector<double> offsets;
    for (const auto& tie : m_ties)
        offsets.push_back(std::abs(tie.offset_m));
    std::nth_element(offsets.begin(),
                     offsets.begin() + static_cast<std::ptrdiff_t>(offsets.size() / 2),
                     offsets.end());
    const double usual_m = offsets[offsets.size() / 2];
    double sd_m = 0.0;
    for (const auto& tie : m_ties)
        sd_m += tie.sd_m / static_cast<double>(m_ties.size());
    if (usual_m > std::max(50.0, 10.0 * sd_m))
        throw DataError{
            "placement.route: half of the tie points lie more than " + text::fixed(usual_m, 0) +
            " m from the route; check placement.crs, the order of x and y, and that the "
            "route is this cable's"};
    for (auto& tie : m_ties) {
        const double limit_m = std::max(15.0, 6.0 * std::hypot(tie.sd_m, usual_m));
        if (std::abs(tie.offset_m) <= limit_m)
            continue;
        tie.used = false;
        tie.reason = "lies " + text::fixed(std::abs(tie.offset_m), 0) + " m from the route";
        m_warnings.push_back({"tie-off-route", tie.place + ": tie point '" + tie.label + "' " +
                                                   tie.reason + "; it was set aside"});
    }
}

void Adjustment::set_aside_blunders() {
    const stats::PathPrior prior = m_route ? route_prior() : free_prior();
    for (;;) {
        const auto which = used();
        if (which.size() <= enough_ties)
            return;
        const auto series = series_of(m_ties, which, m_route.has_value());
        const Expected all = expected_from_others(series, prior, stats::walk_sizes(series, prior));
        // The worst few are tried in turn: without a blunder the walk is narrower and shows it.
        std::vector<std::size_t> order(which.size());
        std::iota(order.begin(), order.end(), std::size_t{0});
        const std::size_t tries = std::min<std::size_t>(which.size() > 2000 ? 3 : 10, order.size());
        std::partial_sort(order.begin(), order.begin() + static_cast<std::ptrdiff_t>(tries),
                          order.end(), [&](std::size_t a, std::size_t b) {
                              return all.z(static_cast<Eigen::Index>(a)) >
                                     all.z(static_cast<Eigen::Index>(b));
                          });
        double worst = blunder_sd, miss_m = 0.0;
        std::size_t blunder = which.size();
        for (std::size_t t = 0; t < tries; ++t) {
            const std::size_t k = order[t];
            if (all.z(static_cast<Eigen::Index>(k)) < 2.0)
                break;
            std::vector<std::size_t> without = which;
            without.erase(without.begin() + static_cast<std::ptrdiff_t>(k));
            const auto sizes =
                stats::walk_sizes(series_of(m_ties, without, m_route.has_value()), prior);
            const Expected here = expected_from_others(series, prior, sizes);
            const auto i = static_cast<Eigen::Index>(k);
            const double floor_m = 3.0 * m_ties[which[k]].sd_m;
            if (here.z(i) > worst && std::abs(here.miss_m(i)) > floor_m) {
                worst = here.z(i);
                miss_m = here.miss_m(i);
                blunder = k;
            }
        }
        if (blunder == which.size())
            return;
        Tie& tie = m_ties[which[blunder]];
        tie.used = false;
        tie.residual_m = miss_m;
        tie.reason = "the others put it " + text::fixed(std::abs(miss_m), 1) + " m " +
                     (m_route ? (miss_m > 0.0 ? "earlier along the route" : "later along the route")
                              : "away") +
                     " (" + text::fixed(worst, 1) + " sd)";
        m_warnings.push_back({"tie-blunder", tie.place + ": tie point '" + tie.label +
                                                 "': " + tie.reason +
                                                 "; it was set aside, check its fibre distance and "
                                                 "coordinates"});
    }
}

void Adjustment::note_residuals() {
    const stats::PathPrior prior = m_route ? route_prior() : free_prior();
    const auto which = used();
    const auto series = series_of(m_ties, which, m_route.has_value());
    if (which.size() < 3)
        return;
    const Expected all = expected_from_others(series, prior, stats::walk_sizes(series, prior));
    for (std::size_t k = 0; k < which.size(); ++k)
        m_ties[which[k]].residual_m = all.miss_m(static_cast<Eigen::Index>(k));
}

PlacedPath Adjustment::place(const Eigen::ArrayXd& path_m) const {
    const stats::PathPrior prior = m_route ? route_prior() : free_prior();
    const auto series = series_of(m_ties, used(), m_route.has_value());
    const auto sizes = stats::walk_sizes(series, prior);
    const Eigen::Index n = path_m.size();
    PlacedPath out{PointsXY(n, 2), Eigen::ArrayXd(n), Eigen::ArrayXd(n), Eigen::ArrayXd(n)};
    if (m_route) {
        const stats::PathEstimate along = stats::smooth_path(series[0], prior, sizes, path_m);
        double last = -std::numeric_limits<double>::infinity();
        for (Eigen::Index j = 0; j < n; ++j) {
            last = std::max(last, along.mean(j)); // the cable never runs backwards
            out.ground_m(j) = last;
        }
        out.xy = m_route->at_all(out.ground_m);
        out.along_variance = along.variance;
        out.across_variance.setConstant(m_across_variance);
        return out;
    }
    const stats::PathEstimate x = stats::smooth_path(series[0], prior, sizes, path_m);
    const stats::PathEstimate y = stats::smooth_path(series[1], prior, sizes, path_m);
    out.xy.col(0) = x.mean;
    out.xy.col(1) = y.mean;
    double ground_m = 0.0;
    for (Eigen::Index j = 0; j < n; ++j) {
        if (j > 0)
            ground_m += (out.xy.row(j) - out.xy.row(j - 1)).matrix().norm();
        out.ground_m(j) = ground_m;
        const Eigen::Vector2d ahead = Eigen::Vector2d{x.rate(j), y.rate(j)}.normalized();
        const double ex = std::isfinite(ahead.x()) ? ahead.x() : 1.0;
        const double ey = std::isfinite(ahead.y()) ? ahead.y() : 0.0;
        out.along_variance(j) = ex * ex * x.variance(j) + ey * ey * y.variance(j);
        out.across_variance(j) = ey * ey * x.variance(j) + ex * ex * y.variance(j);
    }
    return out;
}

} // namespace rillstrand::geo

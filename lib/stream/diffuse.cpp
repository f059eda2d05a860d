// SPDX-License-Identifier: Apache-2.0
#include "stream/diffuse.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {

constexpr double window_m = 40.0; // over which a slope is taken, chosen here
constexpr double stride_m = 5.0;
constexpr double shortest_m = 40.0;

/// Slopes of a profile in windows along the reach, inflows and patches taken out.
struct Slopes {
    std::vector<double> middle_m, per_m;
    double usual = 0.0, sd = 0.0; ///< median and scaled median absolute deviation
};

/// Does a window hold something that is no water coming in?
bool disturbed(const Context& context, double from_m, double to_m) {
    return std::any_of(context.judged.begin(), context.judged.end(), [&](const Judged& j) {
        const Piece& piece = context.solution.pieces[j.piece];
        const bool water = j.verdict == Verdict::inflow || j.verdict == Verdict::spot ||
                           j.verdict == Verdict::declared;
        const double end = piece.type == Piece::Type::box ? piece.to_m : piece.at_m;
        return !water && end > from_m - 3.0 && piece.at_m < to_m + 3.0;
    });
}

Slopes slopes_of(const Context& context, const Weighting& weighting) {
    const Frame& frame = context.frame;
    const std::vector<Piece>& pieces = context.solution.pieces;
    const Reading reading = read(frame, weighting, pieces);
    const Eigen::MatrixXd columns = make_columns(pieces, frame.place_m, frame.response_sd_m);
    Eigen::ArrayXd y = reading.profile.value;
    if (columns.cols() > 0) {
        const ColumnFit fit = fit_columns(reading.whitener(frame), y, columns);
        y -= (columns * fit.value).array();
    }
    Slopes out;
    const double end = frame.place_m[frame.n_place() - 1];
    for (double from = 0.0; from + window_m <= end; from += stride_m) {
        if (disturbed(context, from, from + window_m))
            continue;
        double n = 0.0, sx = 0.0, sy = 0.0, sxx = 0.0, sxy = 0.0;
        for (Eigen::Index j = 0; j < frame.n_place(); ++j) {
            const double x = frame.place_m[j] - from - 0.5 * window_m;
            if (std::abs(x) > 0.5 * window_m)
                continue;
            n += 1.0;
            sx += x;
            sy += y[j];
            sxx += x * x;
            sxy += x * y[j];
        }
        const double det = n * sxx - sx * sx;
        if (n < 6.0 || !(det > 0.0))
            continue;
        out.middle_m.push_back(from + 0.5 * window_m);
        out.per_m.push_back((n * sxy - sx * sy) / det);
    }
    out.usual = median(out.per_m);
    std::vector<double> off;
    for (const double s : out.per_m)
        off.push_back(std::abs(s - out.usual));
    out.sd = 1.482602 * median(std::move(off));
    return out;
}

/// Gain over a piece by one weighting's slopes, with its error: windows that overlap count once.
struct Over {
    double value = 0.0, sd = 0.0;
};
Over gain_over(const Slopes& s, double from_m, double to_m, double reach_m) {
    double sum = 0.0, n = 0.0;
    for (std::size_t k = 0; k < s.per_m.size(); ++k)
        if (s.middle_m[k] >= from_m + 0.3 * window_m && s.middle_m[k] <= to_m - 0.3 * window_m) {
            sum += s.per_m[k] - s.usual;
            n += 1.0;
        }
    const double length = to_m - from_m;
    Over out;
    if (n > 0.0)
        out.value = sum / n * length;
    out.sd = s.sd * length * std::sqrt(window_m / std::max(window_m, length) + window_m / reach_m);
    return out;
}

} // namespace

/// Along a gaining piece the logarithmic profile has an additional slope, the gain a metre over the
/// discharge, in every weighting alike; sun, shade and travel time give a slope that vanishes
/// when their patterns are shut out, and the sun gives none at night. A piece counts if its slope
/// stands out of the reach's usual ones with the heating shut out and at night, and both say the
/// same.
std::vector<DiffuseGain> find_diffuse(const Context& context) {
    std::vector<DiffuseGain> out;
    const Frame& frame = context.frame;
    const double reach_m = frame.place_m[frame.n_place() - 1];
    const Patterns& p = context.patterns;
    if (!context.inflow_degC || reach_m < 10.0 * window_m || p.night.count() < 12 || p.night.all())
        return out;
    const Eigen::ArrayXd& source = *context.inflow_degC;
    const Eigen::Array<bool, Eigen::Dynamic, 1> all = source.isFinite();
    const Eigen::ArrayXd inflow = all.select(source, 0.0);
    const Eigen::ArrayXd contrast = inflow - frame.mean_degC;
    std::vector<Eigen::ArrayXd> heating{p.gradient, p.sun};
    if (shuts_constants_out(context.solution.reading.weighting)) // losses are not among the pieces
        heating.push_back(Eigen::ArrayXd::Ones(frame.n_time()));
    Weighting calm = shut_out("heating", contrast, heating, all);
    Weighting nights = shut_out("day", contrast, {}, all && p.night);
    if (calm.weight.size() == 0 || nights.weight.size() == 0)
        return out;
    calm.inflow = (calm.weight * inflow).sum();
    nights.inflow = (nights.weight * inflow).sum();
    const Slopes a = slopes_of(context, calm);
    const Slopes b = slopes_of(context, nights);
    if (a.per_m.size() != b.per_m.size() || a.per_m.size() < 8)
        return out;
    const double stands_out = 2.0; // of each window, in each weighting; the whole must pass more
    const auto high = [&](std::size_t k) {
        return a.per_m[k] - a.usual > stands_out * a.sd && b.per_m[k] - b.usual > stands_out * b.sd;
    };
    for (std::size_t k = 0; k < a.per_m.size(); ++k) {
        if (!high(k))
            continue;
        const std::size_t first = k;
        while (k + 1 < a.per_m.size() && (high(k + 1) || (k + 2 < a.per_m.size() && high(k + 2))))
            ++k;
        DiffuseGain gain;
        // a window stands out when about half of it lies on the gaining piece
        gain.from_m = a.middle_m[first] - 0.1 * window_m;
        gain.to_m = a.middle_m[k] + 0.1 * window_m;
        if (gain.to_m - gain.from_m < shortest_m)
            continue;
        const Over by_calm = gain_over(a, gain.from_m, gain.to_m, reach_m);
        const Over by_night = gain_over(b, gain.from_m, gain.to_m, reach_m);
        const double gap_sd = std::hypot(by_calm.sd, by_night.sd);
        const bool agree = std::abs(by_calm.value - by_night.value) <
                           2.5 * gap_sd + 0.3 * std::max(by_calm.value, by_night.value);
        const double z = std::min(by_calm.value / by_calm.sd, by_night.value / by_night.sd);
        if (!agree || z < 4.0)
            continue;
        const double wa = 1.0 / (by_calm.sd * by_calm.sd), wb = 1.0 / (by_night.sd * by_night.sd);
        gain.value = (wa * by_calm.value + wb * by_night.value) / (wa + wb);
        // the two share the water: no better than the better one; ends are known to half a window
        const double ends = gain.value * 0.25 * window_m / (gain.to_m - gain.from_m);
        gain.sd = std::hypot(std::min(by_calm.sd, by_night.sd), ends,
                             0.5 * (by_calm.value - by_night.value));
        gain.score = z;
        out.push_back(gain);
    }
    return out;
}

} // namespace rillstrand::stream

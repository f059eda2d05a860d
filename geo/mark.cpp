// SPDX-License-Identifier: Apache-2.0
#include "mark.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <vector>

namespace rillstrand::geo {

namespace {

/// Mean of each channel over the traces of a span of time.
Eigen::ArrayXd mean_between(const record::Source& source, record::PlaceRange range, double from_s,
                            double to_s, Eigen::Index& traces) {
    const record::Axes& axes = source.axes();
    const double* begin = axes.time_s.data();
    const double* end = begin + axes.time_s.size();
    const auto first = std::lower_bound(begin, end, from_s) - begin;
    const auto last = std::upper_bound(begin, end, to_s) - begin;
    traces = last - first;
    Eigen::ArrayXd mean = Eigen::ArrayXd::Constant(range.count, NAN);
    if (traces <= 0)
        return mean;
    Eigen::ArrayXXf block(traces, range.count);
    source.read(record::Quantity::temperature, first, range.first, block);
    for (Eigen::Index j = 0; j < range.count; ++j) {
        double sum = 0.0, n = 0.0;
        for (Eigen::Index i = 0; i < traces; ++i)
            if (!std::isnan(block(i, j))) {
                sum += static_cast<double>(block(i, j));
                n += 1.0;
            }
        if (n > 0.0)
            mean(j) = sum / n;
    }
    return mean;
}

double median(std::vector<double> values) {
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    return *middle;
}

} // namespace

FoundMark find_mark(const record::Source& source, const campaign::Mark& mark,
                    const std::string& place) {
    const record::Axes& axes = source.axes();
    const record::PlaceRange range =
        record::places_between(axes, mark.near_m - mark.within_m, mark.near_m + mark.within_m);
    const std::string what = place + ": mark '" + mark.label + "'";
    if (range.count < 5)
        throw DataError{
            what + ": only " + std::to_string(range.count) +
            " channels lie within within_m of near_m; widen within_m or correct near_m"};
    const double span_s = mark.end_s - mark.begin_s;
    Eigen::Index during_n = 0, before_n = 0, after_n = 0;
    const Eigen::ArrayXd during = mean_between(source, range, mark.begin_s, mark.end_s, during_n);
    const double pause_s = axes.interval_s;
    const Eigen::ArrayXd before = mean_between(source, range, mark.begin_s - span_s - pause_s,
                                               mark.begin_s - pause_s, before_n);
    const Eigen::ArrayXd after =
        mean_between(source, range, mark.end_s + 2.0 * span_s, mark.end_s + 3.0 * span_s, after_n);
    if (during_n == 0 || before_n + after_n == 0)
        throw DataError{what + ": the record has no trace " +
                        (during_n == 0 ? "between its begin and end" : "before and after it") +
                        "; correct the times (UTC) or leave the mark out"};
    const Eigen::ArrayXd base = before_n == 0  ? after
                                : after_n == 0 ? before
                                               : 0.5 * (before + after);
    const double sign = mark.kind == campaign::MarkKind::cold ? -1.0 : 1.0;
    Eigen::ArrayXd d = sign * (during - base);
    d = d.isFinite().select(d, 0.0);
    std::vector<double> values(d.data(), d.data() + d.size());
    const double level = median(values);
    d -= level;
    std::vector<double> steps;
    for (Eigen::Index j = 1; j < d.size(); ++j)
        steps.push_back(std::abs(d(j) - d(j - 1)));
    FoundMark found;
    found.noise_K = std::max(1e-4, median(steps) / (0.6744897501960817 * std::sqrt(2.0)));
    Eigen::Index peak = 0;
    found.peak_K = d.maxCoeff(&peak);
    if (found.peak_K < 6.0 * found.noise_K || found.peak_K < 0.1)
        throw DataError{what + ": no " + (sign < 0.0 ? "cold" : "warm") +
                        " spot stands out between " + text::number(mark.near_m - mark.within_m) +
                        " and " + text::number(mark.near_m + mark.within_m) +
                        " m: the largest change is " + text::fixed(found.peak_K, 2) + " K at " +
                        text::number(axes.distance_m(range.first + peak)) + " m, noise " +
                        text::fixed(found.noise_K, 3) +
                        " K; check begin, end (UTC) and near_m, or leave the mark out"};
    Eigen::Index low = peak, high = peak;
    while (low > 0 && d(low - 1) > found.peak_K / 3.0)
        --low;
    while (high + 1 < d.size() && d(high + 1) > found.peak_K / 3.0)
        ++high;
    low = std::max<Eigen::Index>(0, low - 1);
    high = std::min<Eigen::Index>(d.size() - 1, high + 1);
    double sum = 0.0, moment = 0.0;
    for (Eigen::Index j = low; j <= high; ++j) {
        const double w = std::max(0.0, d(j));
        sum += w;
        moment += w * axes.distance_m(range.first + j);
    }
    found.fibre_m = moment / sum;
    double square = 0.0;
    for (Eigen::Index j = low; j <= high; ++j)
        square += std::pow(axes.distance_m(range.first + j) - found.fibre_m, 2);
    const double spacing_m =
        (axes.distance_m(range.first + high) - axes.distance_m(range.first + low)) /
        static_cast<double>(std::max<Eigen::Index>(1, high - low));
    found.sd_m = std::hypot(found.noise_K * std::sqrt(square) / sum, spacing_m / std::sqrt(12.0));
    return found;
}

} // namespace rillstrand::geo

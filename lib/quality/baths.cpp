// SPDX-License-Identifier: Apache-2.0
#include "quality/baths.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::quality {

namespace {

constexpr double day_s = 86400.0;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Sums for a straight line y = a + b x.
struct LineSums {
    double n = 0.0, x = 0.0, y = 0.0, xx = 0.0, xy = 0.0, yy = 0.0;
    void add(double xi, double yi) {
        n += 1.0;
        x += xi;
        y += yi;
        xx += xi * xi;
        xy += xi * yi;
        yy += yi * yi;
    }
    double sxx() const { return xx - x * x / n; }
    double sxy() const { return xy - x * y / n; }
    double syy() const { return yy - y * y / n; }
    double slope() const { return n < 2.0 || sxx() <= 0.0 ? nan : sxy() / sxx(); }
    double slope_sd() const {
        if (n < 3.0 || sxx() <= 0.0)
            return nan;
        const double rest = std::max(0.0, syy() - sxy() * sxy() / sxx());
        return std::sqrt(rest / (n - 2.0) / sxx());
    }
};

double mean(const std::vector<double>& values) {
    double sum = 0.0;
    for (const double value : values)
        sum += value;
    return values.empty() ? nan : sum / static_cast<double>(values.size());
}

double standard_deviation(const std::vector<double>& values) {
    if (values.size() < 2)
        return 0.0;
    const double centre = mean(values);
    double sum = 0.0;
    for (const double value : values)
        sum += (value - centre) * (value - centre);
    return std::sqrt(sum / static_cast<double>(values.size() - 1));
}

} // namespace

BathReference constant_reference(Eigen::Index n_time, double temperature_degC, double sd_K) {
    return {Eigen::ArrayXd::Constant(n_time, temperature_degC), sd_K};
}

record::PlaceRange inner_places(const record::Axes& axes, double from_m, double to_m,
                                double response_m) {
    const record::PlaceRange all = record::places_between(axes, from_m, to_m);
    const double edge_m = 1.5 * response_m;
    record::PlaceRange inner = record::places_between(axes, from_m + edge_m, to_m - edge_m);
    if (inner.count > 2 && inner.count == all.count)
        inner = {all.first + 1, all.count - 2};
    return inner.count >= 3 ? inner : all;
}

BathResult assess_bath(const record::Source& source, const campaign::Bath& bath,
                       const BathReference& reference, double response_m) {
    const record::Axes& axes = source.axes();
    const record::PlaceRange range = inner_places(axes, bath.from_m, bath.to_m, response_m);
    if (range.count == 0)
        throw DataError{"bath '" + bath.name + "': no channel lies between " +
                        text::number(bath.from_m) + " and " + text::number(bath.to_m) +
                        " m; the record reaches from " + text::number(axes.distance_m(0)) + " to " +
                        text::number(axes.distance_m(axes.n_place() - 1)) + " m"};
    const Eigen::ArrayXd distance_m = axes.distance_m.segment(range.first, range.count);
    Eigen::ArrayXd channel_sum = Eigen::ArrayXd::Zero(range.count);
    Eigen::ArrayXd channel_n = Eigen::ArrayXd::Zero(range.count);
    LineSums in_time;
    double square_sum = 0.0;
    BathResult result;
    const Eigen::Index rows_at_once = std::max<Eigen::Index>(1, source.block_rows());
    for (Eigen::Index i = 0; i < axes.n_time(); i += rows_at_once) {
        const Eigen::Index rows = std::min(rows_at_once, axes.n_time() - i);
        Eigen::ArrayXXf block(rows, range.count);
        source.read(record::Quantity::temperature, i, range.first, block);
        for (Eigen::Index r = 0; r < rows; ++r) {
            const double expected_degC = reference.temperature_degC(i + r);
            if (!std::isfinite(expected_degC))
                continue;
            double sum = 0.0, n = 0.0;
            for (Eigen::Index j = 0; j < range.count; ++j) {
                const double difference_K = static_cast<double>(block(r, j)) - expected_degC;
                if (!std::isfinite(difference_K))
                    continue;
                channel_sum(j) += difference_K;
                channel_n(j) += 1.0;
                square_sum += difference_K * difference_K;
                sum += difference_K;
                n += 1.0;
            }
            if (n > 0.0)
                in_time.add((axes.time_s(i + r) - axes.time_s(0)) / day_s, sum / n);
        }
    }
    result.name = bath.name;
    result.use = bath.use;
    result.from_m = distance_m(0);
    result.to_m = distance_m(range.count - 1);
    result.channels = range.count;
    result.samples = static_cast<Eigen::Index>(channel_n.sum());
    if (result.samples == 0) {
        result.bias_c = result.bias_sd_c = result.rmse_c = nan;
        result.drift_kd = result.drift_sd_kd = result.gradient_km = result.gradient_sd_km = nan;
        return result;
    }
    LineSums along;
    std::vector<double> channel_means;
    for (Eigen::Index j = 0; j < range.count; ++j) {
        if (channel_n(j) == 0.0)
            continue;
        channel_means.push_back(channel_sum(j) / channel_n(j));
        along.add(distance_m(j), channel_means.back());
    }
    const double length_m = distance_m(range.count - 1) - distance_m(0);
    const double independent = std::clamp(length_m / std::max(response_m, 1e-9) + 1.0, 1.0,
                                          static_cast<double>(channel_means.size()));
    const double scatter_K = standard_deviation(channel_means) / std::sqrt(independent);
    result.bias_c = channel_sum.sum() / channel_n.sum();
    result.bias_sd_c = std::hypot(scatter_K, reference.sd_K);
    result.rmse_c = std::sqrt(square_sum / channel_n.sum());
    result.drift_kd = in_time.slope();
    result.drift_sd_kd = in_time.slope_sd();
    result.gradient_km = along.slope();
    // Neighbours within the response share their noise: fewer independent points, wider sd.
    result.gradient_sd_km =
        along.slope_sd() * std::sqrt(static_cast<double>(channel_means.size()) / independent);
    const double ends_K = std::abs(result.gradient_km) * length_m;
    result.stirred = !(ends_K > 0.05 && std::abs(result.gradient_km) > 3.0 * result.gradient_sd_km);
    return result;
}

} // namespace rillstrand::quality

// SPDX-License-Identifier: Apache-2.0
#include "quality/adjust.hpp"

#include "base/text.hpp"
#include "quality/bath_means.hpp"

#include <Eigen/Dense>

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::quality {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double zero_celsius_K = 273.15;

/// A random walk seen through noise, smoothed: both sizes are told from the first differences,
/// var(d) = q + 2 r and cov(d_i, d_i+1) = -r.
/// Source: Rauch, Tung and Striebel (1965), AIAA J. 3, 1445-1450, doi:10.2514/3.3166.
struct SmoothedWalk {
    Eigen::ArrayXd mean, variance;
};

SmoothedWalk smooth_walk(const Eigen::ArrayXd& seen) {
    const Eigen::Index n = seen.size();
    double square = 0.0, product = 0.0, n_square = 0.0, n_product = 0.0, last = nan;
    for (Eigen::Index i = 1; i < n; ++i) {
        const double d = seen(i) - seen(i - 1);
        if (!std::isnan(d)) {
            square += d * d;
            n_square += 1.0;
            if (!std::isnan(last)) {
                product += d * last;
                n_product += 1.0;
            }
        }
        last = d;
    }
    const double difference = n_square > 0.0 ? square / n_square : 0.0;
    const double r = n_product > 10.0
                         ? std::clamp(-product / n_product, 0.02 * difference, 0.5 * difference)
                         : 0.5 * difference;
    const double noise = std::max(r, 1e-12), step = std::max(difference - 2.0 * r, 1e-6 * noise);
    Eigen::ArrayXd mean(n), variance(n), ahead(n);
    double m = 0.0, v = 1e6;
    for (Eigen::Index i = 0; i < n; ++i) {
        v += step;
        ahead(i) = v;
        if (!std::isnan(seen(i))) {
            const double gain = v / (v + noise);
            m += gain * (seen(i) - m);
            v *= 1.0 - gain;
        }
        mean(i) = m;
        variance(i) = v;
    }
    for (Eigen::Index i = n - 1; i-- > 0;) {
        const double gain = variance(i) / ahead(i + 1);
        mean(i) += gain * (mean(i + 1) - mean(i));
        variance(i) += gain * gain * (variance(i + 1) - ahead(i + 1));
    }
    return {mean, variance};
}

class Adjusted final : public record::Source {
public:
    Adjusted(const record::Source& source, Adjustment adjustment)
        : m_source{source}, m_how{std::move(adjustment)} {}
    const record::Axes& axes() const override { return m_source.axes(); }
    bool has(record::Quantity quantity) const override { return m_source.has(quantity); }
    Eigen::Index block_rows() const override { return m_source.block_rows(); }
    Eigen::Index block_columns() const override { return m_source.block_columns(); }
    void read(record::Quantity quantity, Eigen::Index i_time, Eigen::Index j_place,
              Eigen::Ref<Eigen::ArrayXXf> out) const override {
        if (quantity != record::Quantity::temperature) {
            m_source.read(quantity, i_time, j_place, out);
            return;
        }
        if (m_how.method == campaign::AdjustMethod::raman)
            read_raman(i_time, j_place, out);
        else
            read_offset(i_time, j_place, out);
    }

private:
    void read_offset(Eigen::Index i_time, Eigen::Index j_place,
                     Eigen::Ref<Eigen::ArrayXXf> out) const {
        m_source.read(record::Quantity::temperature, i_time, j_place, out);
        for (Eigen::Index j = 0; j < out.cols(); ++j) {
            const double x_m = axes().distance_m(j_place + j) - m_how.middle_m;
            out.col(j) += (m_how.offset_K.segment(i_time, out.rows()) +
                           x_m * m_how.slope_K_m.segment(i_time, out.rows()))
                              .cast<float>();
        }
    }

    void read_raman(Eigen::Index i_time, Eigen::Index j_place,
                    Eigen::Ref<Eigen::ArrayXXf> out) const {
        Eigen::ArrayXXd logarithm(out.rows(), out.cols()), weight(out.rows(), out.cols());
        read_log_ratio(m_source, m_how.double_ended, i_time, j_place, logarithm, weight);
        for (Eigen::Index j = 0; j < out.cols(); ++j) {
            const double x_m = axes().distance_m(j_place + j);
            double lost = m_how.dalpha_1_m * x_m;
            for (const StepLoss& step : m_how.steps)
                if (x_m > step.at_m)
                    lost += step.size;
            out.col(j) =
                (m_how.gamma_K / (logarithm.col(j) + m_how.c.segment(i_time, out.rows()) - lost) -
                 zero_celsius_K)
                    .cast<float>();
        }
    }

    const record::Source& m_source;
    Adjustment m_how;
};

} // namespace

Adjustment adjust_offset(const record::Source& source, const std::vector<AdjustBath>& baths,
                         bool with_slope, double response_m) {
    const BathMeans means = bath_means(source, baths, BathQuantity::temperature);
    const auto n_bath = static_cast<Eigen::Index>(baths.size());
    const Eigen::Index n_time = source.axes().n_time();
    Adjustment out;
    out.method =
        with_slope ? campaign::AdjustMethod::offset_and_slope : campaign::AdjustMethod::offset;
    const Eigen::ArrayXd& x_m = means.distance_m;
    out.middle_m = x_m.mean();
    const double apart_m = x_m.maxCoeff() - x_m.minCoeff();
    if (with_slope && (n_bath < 2 || apart_m < 10.0 * response_m))
        throw DataError{
            "[adjust] method = \"offset-and-slope\": the slope along the fibre cannot be "
            "had from " +
            std::to_string(n_bath) + " adjust baths within " + text::fixed(apart_m, 1) +
            " m; add a bath far along the fibre, or say method = \"offset\""};
    const Eigen::Index n_unknown = with_slope ? 2 : 1;
    Eigen::ArrayXXd seen = Eigen::ArrayXXd::Constant(n_time, 2, nan);
    Eigen::MatrixXd from_baths = Eigen::MatrixXd::Zero(n_unknown, n_bath); // mean of all traces
    double n_solved = 0.0;
    for (Eigen::Index i = 0; i < n_time; ++i) {
        Eigen::MatrixXd design = Eigen::MatrixXd::Zero(n_bath, n_unknown);
        Eigen::VectorXd off = Eigen::VectorXd::Zero(n_bath), weight = off;
        Eigen::Index known = 0;
        for (Eigen::Index b = 0; b < n_bath; ++b) {
            const double difference =
                baths[static_cast<std::size_t>(b)].reference.temperature_degC(i) - means.mean(i, b);
            if (std::isnan(difference))
                continue;
            const double sd =
                std::hypot(means.noise(b), baths[static_cast<std::size_t>(b)].reference.sd_K);
            design(b, 0) = 1.0;
            if (with_slope)
                design(b, 1) = x_m(b) - out.middle_m;
            off(b) = difference;
            weight(b) = 1.0 / std::max(sd * sd, 1e-8);
            ++known;
        }
        if (known < n_unknown)
            continue;
        const Eigen::MatrixXd weighted = design.transpose() * weight.asDiagonal();
        const Eigen::MatrixXd normal = weighted * design;
        const Eigen::MatrixXd gain = normal.ldlt().solve(weighted);
        if (!gain.allFinite())
            continue;
        const Eigen::VectorXd found = gain * off;
        for (Eigen::Index k = 0; k < n_unknown; ++k)
            seen(i, k) = found(k);
        from_baths += gain;
        n_solved += 1.0;
    }
    if (n_solved == 0.0)
        throw DataError{
            "[adjust]: at no time are there readings and references of the baths; check "
            "the probes' times and the baths' places"};
    from_baths /= n_solved;
    const SmoothedWalk offset = smooth_walk(seen.col(0));
    out.offset_K = offset.mean;
    out.slope_K_m = Eigen::ArrayXd::Zero(n_time);
    double slope_variance = 0.0;
    if (with_slope) {
        const SmoothedWalk slope = smooth_walk(seen.col(1));
        out.slope_K_m = slope.mean;
        slope_variance = slope.variance.mean();
    }
    out.channel_sd_K.resize(source.axes().n_place());
    for (Eigen::Index j = 0; j < out.channel_sd_K.size(); ++j) {
        const double at_m = source.axes().distance_m(j) - out.middle_m;
        double variance = offset.variance.mean() + at_m * at_m * slope_variance;
        for (Eigen::Index b = 0; b < n_bath; ++b) {
            const double share = from_baths(0, b) + (with_slope ? at_m * from_baths(1, b) : 0.0);
            variance += std::pow(share * baths[static_cast<std::size_t>(b)].reference.sd_K, 2);
        }
        out.channel_sd_K(j) = std::sqrt(variance);
    }
    return out;
}

std::unique_ptr<record::Source> adjusted(const record::Source& source, Adjustment adjustment) {
    return std::make_unique<Adjusted>(source, std::move(adjustment));
}

} // namespace rillstrand::quality

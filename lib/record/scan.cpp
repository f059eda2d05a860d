// SPDX-License-Identifier: Apache-2.0
#include "record/scan.hpp"

#include "record/counts.hpp"

#include <Eigen/Cholesky>

#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numbers>
#include <vector>

namespace rillstrand::record {

namespace {

constexpr double day_s = 86400.0;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr int n_basis = 6;
using Basis = Eigen::Matrix<double, n_basis, 1>;
using Normal = Eigen::Matrix<double, n_basis, n_basis>;

/// Mean, trend, 24 h and 12 h waves at the times of a record.
class HarmonicBasis {
public:
    explicit HarmonicBasis(const Axes& axes)
        : m_span_d{(axes.time_s(axes.n_time() - 1) - axes.time_s(0)) / day_s},
          m_middle_s{0.5 * (axes.time_s(axes.n_time() - 1) + axes.time_s(0))} {}
    double span_d() const { return m_span_d; }
    Basis at(double time_s) const {
        const double a = 2.0 * std::numbers::pi * std::fmod(time_s, day_s) / day_s;
        const double t = m_span_d > 0.0 ? (time_s - m_middle_s) / (m_span_d * day_s) : 0.0;
        return (Basis() << 1.0, t, std::cos(a), std::sin(a), std::cos(2 * a), std::sin(2 * a))
            .finished();
    }

private:
    double m_span_d;
    double m_middle_s;
};

/// All that one channel gathers while rows go by.
struct ChannelSums {
    double n = 0.0, shift = 0.0, sum = 0.0, sum2 = 0.0;
    float low = std::numeric_limits<float>::infinity();
    float high = -std::numeric_limits<float>::infinity();
    Basis rhs = Basis::Zero();
    Normal missing = Normal::Zero(); ///< what missing rows would have added to the normal matrix
    HundredthCounts values, differences;
    float day_low = 0.0F, day_high = 0.0F;
    double day_n = 0.0, range_sum = 0.0, range_days = 0.0;
    float last = NAN, last_but_one = NAN;

    void close_day(double usual) {
        if (day_n > 0.0 && day_n >= 0.75 * usual) {
            range_sum += static_cast<double>(day_high - day_low);
            range_days += 1.0;
        }
        day_n = 0.0;
    }
    void add(float value, const Basis& basis) {
        if (n == 0.0)
            shift = static_cast<double>(value);
        const double x = static_cast<double>(value) - shift;
        n += 1.0;
        sum += x;
        sum2 += x * x;
        low = std::min(low, value);
        high = std::max(high, value);
        rhs += x * basis;
        values.add(value);
        day_low = day_n > 0.0 ? std::min(day_low, value) : value;
        day_high = day_n > 0.0 ? std::max(day_high, value) : value;
        day_n += 1.0;
    }
};

class TileScan {
public:
    TileScan(const Source& source, const HarmonicBasis& basis, Eigen::Index first,
             Eigen::Index count)
        : m_source{source}, m_axes{source.axes()}, m_basis{basis}, m_first{first},
          m_sums(static_cast<std::size_t>(count)) {
        m_usual = m_axes.interval_s > 0.0
                      ? std::min(day_s / m_axes.interval_s, static_cast<double>(m_axes.n_time()))
                      : 1.0;
    }

    void run(Eigen::Index rows_at_once, Progress& progress) {
        for (Eigen::Index i = 0; i < m_axes.n_time(); i += rows_at_once) {
            const Eigen::Index rows = std::min(rows_at_once, m_axes.n_time() - i);
            m_block.resize(rows, static_cast<Eigen::Index>(m_sums.size()));
            m_source.read(Quantity::temperature, i, m_first, m_block);
            take(i, rows);
            progress.advance(static_cast<double>(rows) * static_cast<double>(m_sums.size()) * 1e-6);
        }
        for (auto& sums : m_sums)
            sums.close_day(m_usual);
    }

    void write(ScanSummary& out) const {
        for (std::size_t k = 0; k < m_sums.size(); ++k)
            write_channel(m_sums[k], m_first + static_cast<Eigen::Index>(k), out);
    }

private:
    void take(Eigen::Index first_row, Eigen::Index rows) {
        std::vector<Basis> basis;
        std::vector<char> even; ///< the two steps before this row are one interval each
        for (Eigen::Index r = 0; r < rows; ++r) {
            const Eigen::Index i = first_row + r;
            basis.push_back(m_basis.at(m_axes.time_s(i)));
            m_normal += basis.back() * basis.back().transpose();
            const double limit_s = 1.5 * m_axes.interval_s;
            even.push_back(i > 1 && m_axes.time_s(i) - m_axes.time_s(i - 1) < limit_s &&
                           m_axes.time_s(i - 1) - m_axes.time_s(i - 2) < limit_s);
        }
        for (std::size_t k = 0; k < m_sums.size(); ++k) {
            ChannelSums& sums = m_sums[k];
            double day = m_day;
            for (Eigen::Index r = 0; r < rows; ++r) {
                const double today = std::floor(m_axes.time_s(first_row + r) / day_s);
                if (today != day) {
                    sums.close_day(m_usual);
                    day = today;
                }
                const float value = m_block(r, static_cast<Eigen::Index>(k));
                const Basis& b = basis[static_cast<std::size_t>(r)];
                if (std::isnan(value)) {
                    sums.missing += b * b.transpose();
                } else {
                    sums.add(value, b);
                    const float second = sums.last_but_one - 2.0F * sums.last + value;
                    if (even[static_cast<std::size_t>(r)] && !std::isnan(second))
                        sums.differences.add(std::abs(second));
                }
                sums.last_but_one = sums.last;
                sums.last = value;
            }
        }
        m_day = std::floor(m_axes.time_s(first_row + rows - 1) / day_s);
    }

    void write_channel(const ChannelSums& s, Eigen::Index j, ScanSummary& out) const {
        out.n(j) = s.n;
        if (s.n == 0.0)
            return;
        const double mean = s.sum / s.n;
        out.mean_degC(j) = s.shift + mean;
        out.sd_degC(j) =
            s.n > 1.0 ? std::sqrt(std::max(0.0, s.sum2 - s.n * mean * mean) / (s.n - 1.0)) : nan;
        out.min_degC(j) = static_cast<double>(s.low);
        out.max_degC(j) = static_cast<double>(s.high);
        out.p05_degC(j) = s.values.quantile(0.05);
        out.p50_degC(j) = s.values.quantile(0.50);
        out.p95_degC(j) = s.values.quantile(0.95);
        if (s.range_days > 0.0)
            out.daily_range_K(j) = s.range_sum / s.range_days;
        if (s.differences.total() > 7)
            out.noise_K(j) = s.differences.spread_median() / (0.6744897501960817 * std::sqrt(6.0));
        write_waves(s, j, out);
    }

    void write_waves(const ChannelSums& s, Eigen::Index j, ScanSummary& out) const {
        if (m_basis.span_d() < 0.95 || s.n < 2.0 * n_basis)
            return;
        const Normal normal = m_normal - s.missing;
        const Eigen::LDLT<Normal> solver{normal};
        // A channel that is missing for most of each day cannot tell the waves apart.
        if (solver.info() != Eigen::Success || solver.rcond() < 1e-8)
            return;
        const Basis fit = solver.solve(s.rhs);
        const double rest = std::max(0.0, s.sum2 - fit.dot(s.rhs)) / (s.n - n_basis);
        const Normal covariance = solver.solve(Normal::Identity()) * rest;
        const double amplitude = std::hypot(fit(2), fit(3));
        out.diurnal_amplitude_K(j) = amplitude;
        out.semidiurnal_amplitude_K(j) = std::hypot(fit(4), fit(5));
        out.trend_Kd(j) = fit(1) / m_basis.span_d();
        out.diurnal_amplitude_sd_K(j) = std::sqrt(0.5 * (covariance(2, 2) + covariance(3, 3)));
        double hour = std::atan2(fit(3), fit(2)) * 12.0 / std::numbers::pi;
        if (hour < 0.0)
            hour += 24.0;
        out.diurnal_phase_h(j) = hour >= 24.0 ? 0.0 : hour;
    }

    const Source& m_source;
    const Axes& m_axes;
    const HarmonicBasis& m_basis;
    Eigen::Index m_first;
    std::vector<ChannelSums> m_sums;
    Normal m_normal = Normal::Zero();
    Eigen::ArrayXXf m_block;
    double m_usual = 1.0;
    double m_day = -1e9;
};

} // namespace

ScanSummary scan(const Source& source, const ScanOptions& options, Progress& progress) {
    const Axes& axes = source.axes();
    const Eigen::Index n = axes.n_place();
    ScanSummary out;
    for (Eigen::ArrayXd* array :
         {&out.n, &out.mean_degC, &out.sd_degC, &out.min_degC, &out.max_degC, &out.p05_degC,
          &out.p50_degC, &out.p95_degC, &out.daily_range_K, &out.diurnal_amplitude_K,
          &out.diurnal_amplitude_sd_K, &out.semidiurnal_amplitude_K, &out.diurnal_phase_h,
          &out.trend_Kd, &out.noise_K})
        *array = Eigen::ArrayXd::Constant(n, nan);
    const HarmonicBasis basis{axes};
    const Eigen::Index columns = options.tile_columns;
    const Eigen::Index rows = options.tile_rows > 0
                                  ? options.tile_rows
                                  : std::clamp<Eigen::Index>(source.block_rows(), 1, 2880);
    progress.stage("scanning the record",
                   static_cast<double>(axes.n_time()) * static_cast<double>(n) * 1e-6,
                   "million samples");
    tbb::parallel_for(Eigen::Index{0}, (n + columns - 1) / columns, [&](Eigen::Index tile) {
        TileScan task{source, basis, tile * columns, std::min(columns, n - tile * columns)};
        task.run(rows, progress);
        task.write(out);
    });
    return out;
}

} // namespace rillstrand::record

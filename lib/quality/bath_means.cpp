// SPDX-License-Identifier: Apache-2.0
#include "quality/bath_means.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::quality {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

void add_way(const record::Source& source, record::Quantity stokes, record::Quantity antistokes,
             Eigen::Index i_time, Eigen::Index j_place, double share,
             Eigen::Ref<Eigen::ArrayXXd> logarithm, Eigen::Ref<Eigen::ArrayXXd> variance) {
    Eigen::ArrayXXf s(logarithm.rows(), logarithm.cols()), a(logarithm.rows(), logarithm.cols());
    source.read(stokes, i_time, j_place, s);
    source.read(antistokes, i_time, j_place, a);
    const Eigen::ArrayXXd strong = s.cast<double>(), weak = a.cast<double>();
    const Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic> good = strong > 0.0 && weak > 0.0;
    logarithm += good.select(share * (strong / weak).log(), nan);
    variance += good.select(share * share * (1.0 / strong + 1.0 / weak), nan);
}

} // namespace

void read_log_ratio(const record::Source& source, bool both_ways, Eigen::Index i_time,
                    Eigen::Index j_place, Eigen::Ref<Eigen::ArrayXXd> logarithm,
                    Eigen::Ref<Eigen::ArrayXXd> variance) {
    using record::Quantity;
    logarithm.setZero();
    variance.setZero();
    const double share = both_ways ? 0.5 : 1.0;
    add_way(source, Quantity::stokes, Quantity::antistokes, i_time, j_place, share, logarithm,
            variance);
    if (both_ways)
        add_way(source, Quantity::reverse_stokes, Quantity::reverse_antistokes, i_time, j_place,
                share, logarithm, variance);
}

double second_difference_noise(const Eigen::ArrayXd& series) {
    std::vector<double> bends;
    for (Eigen::Index i = 1; i + 1 < series.size(); ++i) {
        const double bend = series(i - 1) - 2.0 * series(i) + series(i + 1);
        if (!std::isnan(bend))
            bends.push_back(std::abs(bend));
    }
    if (bends.size() < 3)
        return nan;
    const auto middle = bends.begin() + static_cast<std::ptrdiff_t>(bends.size() / 2);
    std::nth_element(bends.begin(), middle, bends.end());
    return *middle / (0.6745 * std::sqrt(6.0));
}

BathMeans bath_means(const record::Source& source, const std::vector<AdjustBath>& baths,
                     BathQuantity quantity) {
    const record::Axes& axes = source.axes();
    const auto n_bath = static_cast<Eigen::Index>(baths.size());
    BathMeans out;
    out.distance_m.resize(n_bath);
    out.noise.resize(n_bath);
    out.mean = out.variance = Eigen::ArrayXXd::Constant(axes.n_time(), n_bath, nan);
    const Eigen::Index rows_at_once = std::max<Eigen::Index>(1, source.block_rows());
    for (Eigen::Index b = 0; b < n_bath; ++b) {
        const record::PlaceRange range = baths[static_cast<std::size_t>(b)].places;
        out.distance_m(b) = axes.distance_m.segment(range.first, range.count).mean();
        for (Eigen::Index i = 0; i < axes.n_time(); i += rows_at_once) {
            const Eigen::Index rows = std::min(rows_at_once, axes.n_time() - i);
            Eigen::ArrayXXd values(rows, range.count), variance(rows, range.count);
            if (quantity == BathQuantity::temperature) {
                Eigen::ArrayXXf block(rows, range.count);
                source.read(record::Quantity::temperature, i, range.first, block);
                values = block.cast<double>();
                variance.setOnes();
            } else {
                read_log_ratio(source, quantity == BathQuantity::log_ratio_both_ways, i,
                               range.first, values, variance);
            }
            for (Eigen::Index r = 0; r < rows; ++r) {
                double sum = 0.0, n = 0.0, spread = 0.0;
                for (Eigen::Index j = 0; j < range.count; ++j)
                    if (!std::isnan(values(r, j))) {
                        sum += values(r, j);
                        spread += variance(r, j);
                        n += 1.0;
                    }
                // With half the channels missing the mean no longer stands at the bath's middle.
                if (2.0 * n < static_cast<double>(range.count) || n == 0.0)
                    continue;
                out.mean(i + r, b) = sum / n;
                out.variance(i + r, b) = spread / (n * n);
            }
        }
        const double noise = second_difference_noise(out.mean.col(b));
        out.noise(b) = std::isnan(noise) ? 0.05 : noise;
    }
    return out;
}

} // namespace rillstrand::quality

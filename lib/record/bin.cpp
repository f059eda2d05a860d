// SPDX-License-Identifier: Apache-2.0
#include "record/bin.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <vector>

namespace rillstrand::record {

BinnedRecord bin(const Source& source, PlaceRange range, double bin_s, Progress& progress) {
    const Axes& axes = source.axes();
    BinnedRecord out;
    out.bin_s = bin_s;
    out.distance_m = axes.distance_m.segment(range.first, range.count);
    std::vector<Eigen::Index> bin_of(static_cast<std::size_t>(axes.n_time()));
    std::vector<double> middles_s;
    double last = -std::numeric_limits<double>::infinity();
    for (Eigen::Index i = 0; i < axes.n_time(); ++i) {
        const double number = std::floor(axes.time_s(i) / bin_s);
        if (number > last)
            middles_s.push_back((number + 0.5) * bin_s);
        last = number;
        bin_of[static_cast<std::size_t>(i)] = static_cast<Eigen::Index>(middles_s.size()) - 1;
    }
    const auto n_bin = static_cast<Eigen::Index>(middles_s.size());
    out.time_s = Eigen::Map<const Eigen::ArrayXd>(middles_s.data(), n_bin);
    out.mean_degC = Eigen::ArrayXXf::Zero(n_bin, range.count);
    out.count = Eigen::ArrayXXf::Zero(n_bin, range.count);
    const Eigen::Index columns = std::max<Eigen::Index>(1, source.block_columns());
    const Eigen::Index rows = std::clamp<Eigen::Index>(source.block_rows(), 1, 2880);
    const Eigen::Index first_tile = range.first / columns;
    const Eigen::Index last_tile = range.count > 0 ? (range.first + range.count - 1) / columns : -1;
    progress.stage("averaging over bins",
                   static_cast<double>(axes.n_time()) * static_cast<double>(range.count) * 1e-6,
                   "million samples");
    tbb::parallel_for(first_tile, last_tile + 1, [&](Eigen::Index tile) {
        const Eigen::Index begin = std::max(tile * columns, range.first);
        const Eigen::Index end = std::min((tile + 1) * columns, range.first + range.count);
        Eigen::ArrayXXf block;
        for (Eigen::Index i = 0; i < axes.n_time(); i += rows) {
            const Eigen::Index n = std::min(rows, axes.n_time() - i);
            block.resize(n, end - begin);
            source.read(Quantity::temperature, i, begin, block);
            for (Eigen::Index j = 0; j < block.cols(); ++j)
                for (Eigen::Index r = 0; r < n; ++r) {
                    const float value = block(r, j);
                    if (std::isnan(value))
                        continue;
                    const Eigen::Index b = bin_of[static_cast<std::size_t>(i + r)];
                    float& count = out.count(b, begin - range.first + j);
                    float& mean = out.mean_degC(b, begin - range.first + j);
                    count += 1.0F;
                    mean += (value - mean) / count;
                }
            progress.advance(static_cast<double>(n) * static_cast<double>(block.cols()) * 1e-6);
        }
    });
    out.mean_degC = (out.count > 0.0F).select(out.mean_degC, NAN);
    return out;
}

double choose_bin_s(const Axes& axes, Eigen::Index n_place, double at_least_s, double max_bytes) {
    constexpr double day_s = 86400.0;
    const double interval_s = axes.interval_s > 0.0 ? axes.interval_s : at_least_s;
    const double span_s = axes.time_s(axes.n_time() - 1) - axes.time_s(0) + interval_s;
    const double bytes_of_a_bin = 8.0 * static_cast<double>(std::max<Eigen::Index>(n_place, 1));
    const double memory_s = span_s * bytes_of_a_bin / max_bytes;
    const double wanted_s = std::max({at_least_s, memory_s, interval_s});
    // Few bins are as good as many only while they divide the day.
    for (const double bin_s : {60.0, 120.0, 300.0, 600.0, 900.0, 1200.0, 1800.0, 3600.0, 7200.0,
                               10800.0, 14400.0, 21600.0, 43200.0})
        if (bin_s >= wanted_s - 1e-6)
            return bin_s;
    return std::ceil(wanted_s / day_s) * day_s;
}

Eigen::ArrayXXf read_all(const Source& source, PlaceRange range, Quantity quantity) {
    Eigen::ArrayXXf all(source.axes().n_time(), range.count);
    source.read(quantity, 0, range.first, all);
    return all;
}

} // namespace rillstrand::record

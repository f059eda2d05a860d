// SPDX-License-Identifier: Apache-2.0
#include "stream/source.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Upper 1 % point of chi-square (Wilson and Hilferty 1931, Proc. Natl. Acad. Sci. 17, 684).
double chi2_limit(int dof) {
    const double k = double(dof);
    const double c = 1.0 - 2.0 / (9.0 * k) + 2.326348 * std::sqrt(2.0 / (9.0 * k));
    return k * c * c * c;
}

/// The mean profile, by the weights that tell steps in it best.
Reading mean_reading(const Frame& frame, const Patterns& patterns,
                     const std::vector<Piece>& pieces) {
    const Eigen::Index n = frame.n_time();
    const Eigen::ArrayXd one = Eigen::ArrayXd::Ones(n);
    const Eigen::Array<bool, Eigen::Dynamic, 1> all =
        Eigen::Array<bool, Eigen::Dynamic, 1>::Constant(n, true);
    std::vector<Weighting> tries;
    tries.push_back(shut_out("", one, {}, all));
    tries.push_back(shut_out("heating", one, {patterns.gradient}, all));
    tries.push_back(shut_out("sun", one, {patterns.sun}, all));
    if (patterns.night.count() >= 12)
        tries.push_back(shut_out("day", one, {}, patterns.night));
    Reading best;
    best.usual_sd = std::numeric_limits<double>::infinity();
    for (const Weighting& w : tries) {
        if (w.weight.size() == 0)
            continue;
        Reading r;
        r.weighting = w;
        r.profile.value = (frame.water_degC.matrix().transpose() * w.weight.matrix()).array();
        r.profile.white_variance =
            frame.white_K.square() * frame.correlated * w.weight.square().sum();
        const Eigen::MatrixXd columns = make_columns(pieces, frame.place_m, frame.response_sd_m);
        r.rough = estimate_roughness(frame.place_m, r.profile.value, r.profile.white_variance,
                                     columns, stiff_m);
        const ColumnFit fit = fit_columns(r.whitener(frame), r.profile.value, columns);
        r.usual_sd = fit.covariance.size() > 0 ? std::sqrt(fit.covariance.diagonal().minCoeff())
                                               : std::sqrt(r.rough.nugget2);
        if (r.usual_sd < best.usual_sd)
            best = r;
    }
    return best;
}

/// Weighted mean of those that agree; the worst is set apart while they do not.
void pool(SourceTemperature& source, std::vector<std::size_t> members) {
    while (!members.empty()) {
        double weight = 0.0, sum = 0.0;
        for (const std::size_t k : members) {
            const auto i = static_cast<Eigen::Index>(k);
            const double w = 1.0 / (source.own_sd_K[i] * source.own_sd_K[i]);
            weight += w;
            sum += w * source.own_degC[i];
        }
        const double mean = sum / weight;
        double chi2 = 0.0, worst = -1.0;
        std::size_t out = 0;
        for (std::size_t m = 0; m < members.size(); ++m) {
            const auto i = static_cast<Eigen::Index>(members[m]);
            const double z = (source.own_degC[i] - mean) / source.own_sd_K[i];
            chi2 += z * z;
            if (z * z > worst) {
                worst = z * z;
                out = m;
            }
        }
        const int dof = static_cast<int>(members.size()) - 1;
        if (dof > 0 && chi2 > chi2_limit(dof) && worst > 9.0 && members.size() > 2) {
            source.apart.push_back(members[out]);
            members.erase(members.begin() + static_cast<std::ptrdiff_t>(out));
            continue;
        }
        source.found = true;
        source.degC = mean;
        source.chi2 = chi2;
        source.count = static_cast<int>(members.size());
        const double excess = dof > 0 ? std::max(1.0, chi2 / dof) : 1.0;
        source.sd_K = std::sqrt(excess / weight);
        return;
    }
}

} // namespace

SourceTemperature source_temperature(const Frame& frame, const Patterns& patterns,
                                     const Solution& shares, const std::vector<Judged>& judged) {
    SourceTemperature source;
    const auto n = static_cast<Eigen::Index>(shares.pieces.size());
    source.own_degC = Eigen::VectorXd::Constant(n, nan);
    source.own_sd_K = Eigen::VectorXd::Constant(n, nan);
    if (n == 0)
        return source;
    const Reading means = mean_reading(frame, patterns, shares.pieces);
    const Estimate steps = estimate(frame, means, shares.pieces);
    std::vector<std::size_t> members;
    for (const Judged& j : judged) {
        if (j.verdict != Verdict::inflow || j.value < 4.0 * j.sd)
            continue;
        const auto i = static_cast<Eigen::Index>(j.piece);
        const double f = 1.0 - std::exp(-j.value);
        const double f_sd = std::exp(-j.value) * j.sd;
        const double at = shares.pieces[j.piece].at_m;
        const double margin = 3.0 * frame.response_sd_m;
        const double upstream = (beside(frame, at, margin, -8.0) * means.weighting.weight).sum();
        const double contrast = steps.value[i] / f;
        source.own_degC[i] = upstream + contrast;
        source.own_sd_K[i] = std::hypot(steps.sd[i] / f, contrast * f_sd / f);
        if (source.own_sd_K[i] < 3.0)
            members.push_back(j.piece);
    }
    pool(source, members);
    return source;
}

} // namespace rillstrand::stream

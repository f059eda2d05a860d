// SPDX-License-Identifier: Apache-2.0
#include "bed/fit.hpp"

#include "heat/ground.hpp"

#include <Eigen/Cholesky>
#include <Eigen/LU>

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::bed {

namespace {

using Eigen::ArrayXd;
using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

constexpr double pi = 3.14159265358979323846;
constexpr double freedom = 4.0;   // of the flux's steps
constexpr double ridge_unit = 50; // no bed takes more than some 5 m/d: common practice, no source

/// What is estimated beside the unknowns.
struct Sizes {
    double step_unit = 0.0; // sd of the flux's step between knots
    ArrayXd step_weight;    // of each step; below 1 where it is a jump
    double offset_K = 0.02;
    double boundary_K = 0.0; // of a boundary's knots
    ArrayXd weight;          // of a sample of each place
    ArrayXd sample_sd_K;
    double spread = 1.0;
};

class Fitter {
public:
    explicit Fitter(const FitInput& input)
        : m_in{input}, m_layout{make_layout(input)}, m_march{m_in.profile, m_layout,
                                                             input.conductivity_W_m_K,
                                                             input.capacity_J_m3_K} {
        const Index steps = m_layout.n_knot - 1;
        m_sizes.step_unit = 0.3 * std::sqrt(m_layout.knot_s / 10800.0);
        m_sizes.step_weight = ArrayXd::Ones(steps);
        m_sizes.sample_sd_K = input.noise_K;
        m_sizes.weight = input.noise_K.square().inverse();
        m_sizes.boundary_K =
            input.boundary_noise_K * std::sqrt(input.profile.step_s / m_layout.knot_s);
    }

    FitResult run() {
        VectorXd unknowns = first_guess();
        bool converged = false;
        constexpr int most = 16;
        MatrixXd covariance;
        for (int i = 0; i < most && !converged; ++i) {
            const Normal normal = m_march.pass(unknowns, m_sizes.weight, false);
            const MatrixXd prior = prior_precision(unknowns);
            const Eigen::LLT<MatrixXd> solver{normal.hessian + prior};
            const VectorXd step = solver.solve(normal.gradient - prior * unknowns);
            const double length = advance(unknowns, step, normal.misfit, prior);
            covariance = solver.solve(MatrixXd::Identity(unknowns.size(), unknowns.size()));
            const Normal after = m_march.pass(unknowns, m_sizes.weight, true);
            const double moved = resize(unknowns, covariance, normal.hessian, after.residual_K);
            converged = i >= 5 && length < 0.2 && moved < 0.05;
        }
        // The covariance that belongs to the last sizes.
        const Normal normal = m_march.pass(unknowns, m_sizes.weight, false);
        const MatrixXd precision = normal.hessian + prior_precision(unknowns);
        covariance = precision.llt().solve(MatrixXd::Identity(unknowns.size(), unknowns.size()));
        covariance += hidden(precision, hold(unknowns));
        return result(unknowns, covariance, normal, converged);
    }

private:
    static Layout make_layout(const FitInput& input) {
        const Profile& p = input.profile;
        Layout l;
        l.n_place = p.depth_m.size();
        const double length = p.bottom_m - p.top_m;
        l.n_layer = std::clamp<Index>(l.n_place, 1, 4);
        l.n_kernel = p.averaging_m > 0.0 ? 2 : 0;
        l.n_start = std::clamp<Index>(l.n_place, 1, 10);
        l.n_segment = static_cast<Index>(p.segments.size());
        l.knot_s =
            choose_knot_s(length, input.conductivity_W_m_K / input.capacity_J_m3_K, p.step_s);
        const double begin_s = p.time_s(p.segments.front().first);
        const Segment& end = p.segments.back();
        const double end_s = p.time_s(end.first + end.count - 1);
        l.first_knot_s = std::floor(begin_s / l.knot_s) * l.knot_s;
        l.n_knot = std::max<Index>(
            3, static_cast<Index>(std::ceil((end_s - l.first_knot_s) / l.knot_s)) + 1);
        return l;
    }

    /// One flux for all times, the best of a few: the misfit has several valleys only there.
    VectorXd first_guess() const {
        VectorXd best, unknowns = VectorXd::Zero(m_layout.size());
        double least = std::numeric_limits<double>::infinity();
        for (const double unit : {-20., -10., -5., -2.5, -1., 0., 1., 2.5, 5., 10., 20.}) {
            unknowns.segment(m_layout.flux(), m_layout.n_knot).setConstant(unit);
            const double misfit = m_march.pass(unknowns, m_sizes.weight, true).misfit;
            if (misfit < least) {
                least = misfit;
                best = unknowns;
            }
        }
        return best;
    }

    /// Covariance of log conductivity and log capacity by depth, as trusted.
    MatrixXd property_covariance() const {
        const Index n = m_layout.n_layer;
        const auto block = [n](double whole, double layer) -> MatrixXd {
            MatrixXd cov = MatrixXd::Constant(n, n, whole * whole);
            cov.diagonal().array() += layer * layer / (n == 1 ? 4.0 : 1.0);
            return cov;
        };
        const Trust& t = m_in.trust;
        MatrixXd cov = MatrixXd::Zero(2 * n, 2 * n);
        cov.topLeftCorner(n, n) = block(t.conductivity, t.conductivity_layer);
        cov.bottomRightCorner(n, n) = block(t.capacity, t.capacity_layer);
        return cov;
    }

    /// How much more than its due the stated properties count. Where water comes up fast, all
    /// change stays within centimetres and answers within minutes: what the fit would learn of the
    /// properties is then errors of clock, surface and averaging, and it must not.
    double hold(const VectorXd& unknowns) const {
        const double up_m_s = std::max(
            0.0, -flux_unit_m_s * unknowns.segment(m_layout.flux(), m_layout.n_knot).mean() *
                     heat::water_heat_capacity_J_m3_K / m_in.capacity_J_m3_K);
        constexpr double fast_m_s = 1.3e-5; // answers within some two thousand seconds
        return std::min(1e4, 1.0 + std::pow(up_m_s / fast_m_s, 8));
    }

    /// What holding the properties has hidden of their uncertainty, carried over to all unknowns.
    MatrixXd hidden(const MatrixXd& precision, double held) const {
        const Index n = 2 * m_layout.n_layer, rest = m_layout.size() - n;
        if (held < 1.05)
            return MatrixXd::Zero(m_layout.size(), m_layout.size());
        MatrixXd by_property = MatrixXd::Zero(m_layout.size(), n);
        by_property.topRows(n).setIdentity();
        by_property.bottomRows(rest) = -precision.bottomRightCorner(rest, rest)
                                            .llt()
                                            .solve(precision.bottomLeftCorner(rest, n));
        return by_property * ((1.0 - 1.0 / held) * property_covariance()) * by_property.transpose();
    }

    MatrixXd prior_precision(const VectorXd& unknowns) const {
        const Layout& l = m_layout;
        MatrixXd p = MatrixXd::Zero(l.size(), l.size());
        const Trust& t = m_in.trust;
        p.topLeftCorner(2 * l.n_layer, 2 * l.n_layer) =
            hold(unknowns) * property_covariance().inverse();
        auto d = p.diagonal().array();
        if (l.n_kernel > 0) {
            d(l.kernel()) += 1.0 / (t.averaging * t.averaging);
            d(l.kernel() + 1) += 1e-4 / (t.datum_m * t.datum_m);
        }
        d.segment(l.offsets(), l.n_place) += 1.0 / (m_sizes.offset_K * m_sizes.offset_K);
        d.segment(l.starts(), l.n_start * l.n_segment) += 1.0 / (0.5 * 0.5);
        d.segment(l.flux(), l.n_knot) +=
            1.0 / (ridge_unit * ridge_unit * static_cast<double>(l.n_knot));
        d.segment(l.top(), 2 * l.n_knot) += 1.0 / (m_sizes.boundary_K * m_sizes.boundary_K);
        for (Index k = 0; k + 1 < l.n_knot; ++k) {
            const double w = m_sizes.step_weight(k) / (m_sizes.step_unit * m_sizes.step_unit);
            const Index a = l.flux() + k;
            p(a, a) += w;
            p(a + 1, a + 1) += w;
            p(a, a + 1) -= w;
            p(a + 1, a) -= w;
        }
        return p;
    }

    /// Goes along a step as far as it helps. @return greatest change of a flux, in 0.1 m/d
    double advance(VectorXd& unknowns, const VectorXd& step, double misfit,
                   const MatrixXd& prior) const {
        const double before = misfit + unknowns.dot(prior * unknowns);
        for (double share = 1.0; share > 0.02; share *= 0.5) {
            const VectorXd trial = unknowns + share * step;
            const double after =
                m_march.pass(trial, m_sizes.weight, true).misfit + trial.dot(prior * trial);
            if (after <= before * (1.0 + 1e-9)) {
                unknowns = trial;
                return share *
                       step.segment(m_layout.flux(), m_layout.n_knot).array().abs().maxCoeff();
            }
        }
        return 0.0;
    }

    /// Noise, walk and offsets anew from the residuals and the unknowns.
    /// @return greatest relative change
    double resize(const VectorXd& unknowns, const MatrixXd& covariance, const MatrixXd& hessian,
                  const Eigen::ArrayXXd& residual_K) {
        const double old_step = m_sizes.step_unit;
        const Layout& l = m_layout;
        double sum = 0.0;
        for (Index k = 0; k + 1 < l.n_knot; ++k) {
            const Index a = l.flux() + k;
            const double step = unknowns(a + 1) - unknowns(a);
            const double e2 = step * step + covariance(a, a) + covariance(a + 1, a + 1) -
                              2.0 * covariance(a, a + 1);
            m_sizes.step_weight(k) = (freedom + 1.0) / (freedom + e2 / (old_step * old_step));
            sum += m_sizes.step_weight(k) * e2;
        }
        m_sizes.step_unit = std::max(1e-3, std::sqrt(sum / static_cast<double>(l.n_knot - 1)));
        double offsets = 0.0;
        for (Index j = l.offsets(); j < l.offsets() + l.n_place; ++j)
            offsets += unknowns(j) * unknowns(j) + covariance(j, j);
        // One offset more of the usual size, so that few places do not make it vanish.
        m_sizes.offset_K =
            std::sqrt((offsets + 2.0 * 0.01 * 0.01) / (static_cast<double>(l.n_place) + 2.0));
        const double taken = (hessian.array() * covariance.array()).sum();
        weigh(residual_K, taken);
        return std::abs(std::log(m_sizes.step_unit / old_step));
    }

    void weigh(const Eigen::ArrayXXd& residual_K, double taken) {
        const Index n = m_layout.n_place;
        double count = 0.0;
        ArrayXd n_j(n), variance(n);
        for (Index j = 0; j < n; ++j) {
            const auto r = residual_K.col(j);
            n_j(j) = static_cast<double>(r.isFinite().count());
            variance(j) = r.isFinite().select(r.square(), 0.0).sum() / std::max(1.0, n_j(j));
            count += n_j(j);
        }
        variance *= count / std::max(0.2 * count, count - taken);
        // A place of few samples leans on the others.
        const double usual = (variance * n_j).sum() / count;
        variance = (variance * n_j + 5.0 * usual) / (n_j + 5.0);
        m_sizes.sample_sd_K = variance.max(1e-6).sqrt();
        m_sizes.spread = spread_of(residual_K);
        m_sizes.weight = (m_sizes.sample_sd_K.square() * m_sizes.spread).inverse();
    }

    /// Variance of means over some hours and over depth, against that of white noise; at least 1.
    double spread_of(const Eigen::ArrayXXd& residual_K) const {
        const auto batch = std::max<Index>(
            4, static_cast<Index>(std::lround(2.0 * m_layout.knot_s / m_in.profile.step_s)));
        double own = 0.0, own_n = 0.0, joint = 0.0, joint_n = 0.0;
        for (const Segment& s : m_in.profile.segments)
            for (Index i = s.first; i + batch <= s.first + s.count; i += batch) {
                double sum_all = 0.0, places = 0.0;
                for (Index j = 0; j < m_layout.n_place; ++j) {
                    double sum = 0.0, n = 0.0;
                    for (Index k = i; k < i + batch; ++k)
                        if (!std::isnan(residual_K(k, j))) {
                            sum += residual_K(k, j);
                            n += 1.0;
                        }
                    if (n < 0.5 * static_cast<double>(batch))
                        continue;
                    const double z = sum / std::sqrt(n) / m_sizes.sample_sd_K(j);
                    own += z * z;
                    own_n += 1.0;
                    sum_all += z;
                    places += 1.0;
                }
                if (places > 1.0) {
                    joint += sum_all * sum_all / places;
                    joint_n += 1.0;
                }
            }
        if (own_n < 10.0)
            return 1.0;
        const double alone = own / own_n;
        const double together = joint_n > 4.0 ? joint / joint_n : alone;
        return std::clamp(std::max(alone, together), 1.0, 1000.0);
    }

    FitResult result(const VectorXd& unknowns, const MatrixXd& covariance, const Normal& normal,
                     bool converged) const {
        const Layout& l = m_layout;
        FitResult r;
        r.layout = l;
        r.unknowns = unknowns;
        // Flux = scale times front, scale = exp(mean log capacity).
        const double scale = std::exp(unknowns.segment(l.capacity(), l.n_layer).mean());
        const VectorXd front = unknowns.segment(l.flux(), l.n_knot);
        r.flux_unit = scale * front;
        const MatrixXd with_scale =
            covariance.block(l.flux(), l.capacity(), l.n_knot, l.n_layer).rowwise().mean();
        const double scale_variance =
            covariance.block(l.capacity(), l.capacity(), l.n_layer, l.n_layer).mean();
        r.flux_covariance = scale * scale *
                            (covariance.block(l.flux(), l.flux(), l.n_knot, l.n_knot) +
                             with_scale * front.transpose() + front * with_scale.transpose() +
                             scale_variance * front * front.transpose());
        VectorXd mean = VectorXd::Zero(l.size());
        mean.segment(l.conductivity(), l.n_layer).setConstant(1.0 / static_cast<double>(l.n_layer));
        mean.segment(l.capacity(), l.n_layer).setConstant(-1.0 / static_cast<double>(l.n_layer));
        r.diffusivity_m2_s =
            m_in.conductivity_W_m_K / m_in.capacity_J_m3_K * std::exp(mean.dot(unknowns));
        r.diffusivity_sd_m2_s =
            r.diffusivity_m2_s *
            std::hypot(std::sqrt(mean.dot(covariance * mean)), 2.0 * m_in.trust.depth_scale);
        const auto seen = normal.residual_K.isFinite();
        r.noise_K = std::sqrt(seen.select(normal.residual_K.square(), 0.0).sum() /
                              std::max(1.0, static_cast<double>(seen.count())));
        r.residual_spread = m_sizes.spread;
        r.variability_m_d = 0.1 * m_sizes.step_unit * std::sqrt(86400.0 / l.knot_s);
        r.offset_sd_K = m_sizes.offset_K;
        r.converged = converged;
        return r;
    }

    const FitInput& m_in;
    Layout m_layout;
    March m_march;
    Sizes m_sizes;
};

/// Integral over [a, b] of the hat that stands at 0 and is 1 wide to either side.
double hat_integral(double a, double b) {
    const auto up_to = [](double x) {
        x = std::clamp(x, -1.0, 1.0);
        return x < 0.0 ? 0.5 * (1.0 + x) * (1.0 + x) : 1.0 - 0.5 * (1.0 - x) * (1.0 - x);
    };
    return up_to(b) - up_to(a);
}

} // namespace

double choose_knot_s(double length_m, double diffusivity_m2_s, double step_s) {
    const double fade_s = length_m * length_m / (pi * pi * diffusivity_m2_s);
    const double wanted_s = std::max({3.0 * 3600.0, 4.0 * step_s, fade_s / 15.0});
    if (wanted_s <= 86400.0) {
        for (const double hours : {3.0, 4.0, 6.0, 8.0, 12.0, 24.0})
            if (hours * 3600.0 >= wanted_s - 1.0)
                return hours * 3600.0;
    }
    return std::ceil(wanted_s / 86400.0) * 86400.0;
}

FitResult fit_profile(const FitInput& input) {
    Fitter fitter{input};
    return fitter.run();
}

FitResult::Mean FitResult::mean(double begin_s, double end_s, double depth_scale) const {
    VectorXd w = VectorXd::Zero(layout.n_knot);
    const double a = (begin_s - layout.first_knot_s) / layout.knot_s;
    const double b = (end_s - layout.first_knot_s) / layout.knot_s;
    for (Index k = 0; k < layout.n_knot; ++k)
        w(k) = hat_integral(a - static_cast<double>(k), b - static_cast<double>(k)) / (b - a);
    w /= w.sum();
    const double unit = w.dot(flux_unit);
    const double sd = std::sqrt(w.dot(flux_covariance * w));
    return {unit * flux_unit_m_s, flux_unit_m_s * std::hypot(sd, depth_scale * unit)};
}

} // namespace rillstrand::bed

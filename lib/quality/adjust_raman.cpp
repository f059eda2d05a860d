// SPDX-License-Identifier: Apache-2.0
#include "quality/adjust.hpp"
#include "quality/bath_means.hpp"
#include "quality/step_losses.hpp"

#include "base/text.hpp"

#include <Eigen/Dense>

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::quality {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double zero_celsius_K = 273.15;

/// Columns are scaled to about one: gamma in 300 K, dalpha by the record's length.
class RamanFit {
public:
    RamanFit(const record::Source& source, const std::vector<AdjustBath>& baths, bool both_ways,
             std::vector<StepLoss> steps)
        : m_baths{baths}, m_axes{source.axes()}, m_both_ways{both_ways}, m_steps{std::move(steps)},
          m_means{
              bath_means(source, baths,
                         both_ways ? BathQuantity::log_ratio_both_ways : BathQuantity::log_ratio)} {
        m_length_m = std::max(1.0, m_axes.distance_m(m_axes.n_place() - 1));
        m_unknowns = both_ways ? 1 : 2 + static_cast<Eigen::Index>(m_steps.size());
        find_scale();
    }

    Adjustment run() {
        accumulate();
        refuse_untellable();
        const Eigen::VectorXd theta = m_inverse * m_right;
        Adjustment out;
        out.method = campaign::AdjustMethod::raman;
        out.double_ended = m_both_ways;
        out.gamma_K = theta(0) * gamma_unit_K;
        const Eigen::MatrixXd covariance = m_inverse + reference_part(theta);
        out.gamma_sd_K = std::sqrt(covariance(0, 0)) * gamma_unit_K;
        if (!m_both_ways) {
            out.dalpha_1_m = theta(1) / m_length_m;
            out.dalpha_sd_1_m = std::sqrt(covariance(1, 1)) / m_length_m;
        }
        out.steps = m_steps;
        for (std::size_t k = 0; k < m_steps.size(); ++k) {
            const auto at = static_cast<Eigen::Index>(k) + 2;
            out.steps[k].size = theta(at);
            out.steps[k].size_sd = std::sqrt(covariance(at, at));
            out.steps[k].apparent_K = -theta(at) * 283.15 * 283.15 / out.gamma_K;
        }
        tell_c(theta, out);
        tell_channel_sd(theta, out);
        if (out.gamma_K < 450.0 || out.gamma_K > 520.0)
            out.warnings.push_back({"adjust-gamma-unusual",
                                    "the fitted gamma is " + text::fixed(out.gamma_K, 1) + " ± " +
                                        text::fixed(out.gamma_sd_K, 1) +
                                        " K, outside 450 to 520 K; check the baths' places, their "
                                        "probes and which column holds which power"});
        return out;
    }

private:
    static constexpr double gamma_unit_K = 300.0;

    Eigen::VectorXd row(double temperature_K, double at_m) const {
        Eigen::VectorXd a(m_unknowns);
        a(0) = gamma_unit_K / temperature_K;
        if (m_both_ways)
            return a;
        a(1) = at_m / m_length_m;
        for (std::size_t k = 0; k < m_steps.size(); ++k)
            a(static_cast<Eigen::Index>(k) + 2) = at_m > m_steps[k].at_m ? 1.0 : 0.0;
        return a;
    }

    double reference_K(Eigen::Index i, Eigen::Index b) const {
        return m_baths[static_cast<std::size_t>(b)].reference.temperature_degC(i) + zero_celsius_K;
    }

    /// Variance of a logarithm in units of 1 / P_s + 1 / P_as, from second differences in time.
    void find_scale() {
        double sum = 0.0, n = 0.0;
        for (Eigen::Index b = 0; b < m_means.mean.cols(); ++b) {
            double unit = 0.0, count = 0.0;
            for (const double v : m_means.variance.col(b))
                if (!std::isnan(v)) {
                    unit += v;
                    count += 1.0;
                }
            if (count < 3.0 || !(unit > 0.0))
                continue;
            sum += m_means.noise(b) * m_means.noise(b) * count / unit;
            n += 1.0;
        }
        m_scale = n > 0.0 && sum > 0.0 ? sum / n : 1.0;
    }

    /// Calls use(i, weights, rows, logarithms, baths) for every trace with two baths or more.
    template <class Use> void each_trace(const Use& use) const {
        const auto n_bath = m_means.mean.cols();
        for (Eigen::Index i = 0; i < m_axes.n_time(); ++i) {
            std::vector<Eigen::Index> known;
            for (Eigen::Index b = 0; b < n_bath; ++b)
                if (!std::isnan(m_means.mean(i, b)) && !std::isnan(reference_K(i, b)))
                    known.push_back(b);
            if (known.empty())
                continue;
            const auto n = static_cast<Eigen::Index>(known.size());
            Eigen::MatrixXd rows(n, m_unknowns);
            Eigen::VectorXd y(n), w(n);
            for (Eigen::Index k = 0; k < n; ++k) {
                const Eigen::Index b = known[static_cast<std::size_t>(k)];
                rows.row(k) = row(reference_K(i, b), m_means.distance_m(b)).transpose();
                y(k) = m_means.mean(i, b);
                w(k) = 1.0 / (m_scale * m_means.variance(i, b));
            }
            use(i, w, rows, y, known);
        }
    }

    void accumulate() {
        m_normal = Eigen::MatrixXd::Zero(m_unknowns, m_unknowns);
        m_right = Eigen::VectorXd::Zero(m_unknowns);
        m_from_reference = Eigen::MatrixXd::Zero(m_unknowns, m_means.mean.cols());
        each_trace([&](Eigen::Index i, const Eigen::VectorXd& w, const Eigen::MatrixXd& rows,
                       const Eigen::VectorXd& y, const std::vector<Eigen::Index>& known) {
            if (known.size() < 2)
                return;
            const double sum = w.sum();
            const Eigen::RowVectorXd middle = w.transpose() * rows / sum;
            const Eigen::MatrixXd off = rows.rowwise() - middle;
            const Eigen::MatrixXd weighted = off.transpose() * w.asDiagonal();
            m_normal += weighted * off;
            m_right += weighted * (y.array() - w.dot(y) / sum).matrix();
            for (std::size_t k = 0; k < known.size(); ++k) {
                const double t = reference_K(i, known[k]);
                m_from_reference.col(known[k]) +=
                    weighted.col(static_cast<Eigen::Index>(k)) / (t * t);
            }
        });
        for (std::size_t k = 0; k < m_steps.size(); ++k) {
            const auto at = static_cast<Eigen::Index>(k) + 2;
            const double precision = 1.0 / (m_steps[k].size_sd * m_steps[k].size_sd);
            m_normal(at, at) += precision;
            m_right(at) += precision * m_steps[k].size;
        }
    }

    void refuse_untellable() {
        const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver{m_normal};
        const double least = solver.eigenvalues()(0), most = solver.eigenvalues().maxCoeff();
        const std::string head = "[adjust] method = \"raman\": ";
        const std::string mends =
            m_both_ways ? "two adjust baths of clearly different temperature are needed"
                        : "three adjust baths are needed, two of clearly different temperature and "
                          "one far along the fibre";
        if (!(least > 1e-12 * most)) {
            Eigen::Index which = 0;
            solver.eigenvectors().col(0).cwiseAbs().maxCoeff(&which);
            throw DataError{head +
                            (which == 0 ? "gamma"
                                        : (which == 1 ? "the differential "
                                                        "attenuation dalpha"
                                                      : "a step loss")) +
                            " cannot be had from these baths; " + mends};
        }
        m_inverse = m_normal.inverse();
        const double gamma_sd_K = std::sqrt(m_inverse(0, 0)) * gamma_unit_K;
        if (gamma_sd_K > 25.0)
            throw DataError{head + "gamma cannot be had: it stays uncertain by " +
                            text::fixed(gamma_sd_K, 0) +
                            " K since the baths' temperatures are too alike; " + mends};
        if (m_both_ways)
            return;
        const double end_K = std::sqrt(m_inverse(1, 1)) * 283.0 * 283.0 / 480.0;
        if (end_K > 1.0)
            throw DataError{head +
                            "the differential attenuation dalpha cannot be had: over the "
                            "cable it stays uncertain by " +
                            text::fixed(end_K, 1) + " K; " + mends};
    }

    /// Covariance from the references' own errors, one a bath for all times.
    Eigen::MatrixXd reference_part(const Eigen::VectorXd& theta) const {
        Eigen::MatrixXd part = Eigen::MatrixXd::Zero(m_unknowns, m_unknowns);
        for (Eigen::Index b = 0; b < m_means.mean.cols(); ++b) {
            const Eigen::VectorXd moved = reference_effect(theta, b);
            part += moved * moved.transpose();
        }
        return part;
    }

    /// What an error of one sd of a bath's reference does to the unknowns.
    Eigen::VectorXd reference_effect(const Eigen::VectorXd& theta, Eigen::Index b) const {
        return m_inverse * m_from_reference.col(b) * theta(0) * gamma_unit_K *
               m_baths[static_cast<std::size_t>(b)].reference.sd_K;
    }

    void tell_c(const Eigen::VectorXd& theta, Adjustment& out) {
        out.c = Eigen::ArrayXd::Constant(m_axes.n_time(), nan);
        m_middle = Eigen::VectorXd::Zero(m_unknowns);
        m_share = Eigen::VectorXd::Zero(m_means.mean.cols());
        double n = 0.0;
        each_trace([&](Eigen::Index i, const Eigen::VectorXd& w, const Eigen::MatrixXd& rows,
                       const Eigen::VectorXd& y, const std::vector<Eigen::Index>& known) {
            const double sum = w.sum();
            out.c(i) = w.dot(rows * theta - y) / sum;
            m_middle += rows.transpose() * w / sum;
            for (std::size_t k = 0; k < known.size(); ++k) {
                const double t = reference_K(i, known[k]);
                m_share(known[k]) += w(static_cast<Eigen::Index>(k)) / sum / (t * t);
            }
            m_c_variance += 1.0 / sum;
            n += 1.0;
        });
        m_middle /= n;
        m_share /= n;
        m_c_variance /= n;
        Eigen::Index missing = out.c.isNaN().count();
        if (missing > 0)
            out.warnings.push_back(
                {"adjust-traces-without-bath", std::to_string(missing) +
                                                   " traces have no reading of an adjust "
                                                   "bath and are set missing"});
    }

    void tell_channel_sd(const Eigen::VectorXd& theta, Adjustment& out) const {
        const double gamma = out.gamma_K, t = mean_temperature_K();
        const double per_log = t * t / gamma;
        out.channel_sd_K.resize(m_axes.n_place());
        for (Eigen::Index j = 0; j < out.channel_sd_K.size(); ++j) {
            const Eigen::VectorXd lever = m_middle - row(t, m_axes.distance_m(j));
            double variance = lever.dot(m_inverse * lever) + m_c_variance;
            for (Eigen::Index b = 0; b < m_means.mean.cols(); ++b) {
                const double sd = m_baths[static_cast<std::size_t>(b)].reference.sd_K;
                variance +=
                    std::pow(lever.dot(reference_effect(theta, b)) - m_share(b) * gamma * sd, 2);
            }
            out.channel_sd_K(j) = per_log * std::sqrt(variance);
        }
    }

    double mean_temperature_K() const {
        double sum = 0.0, n = 0.0;
        for (const auto& bath : m_baths)
            for (const double t : bath.reference.temperature_degC)
                if (!std::isnan(t)) {
                    sum += t + zero_celsius_K;
                    n += 1.0;
                }
        return sum / n;
    }

    const std::vector<AdjustBath>& m_baths;
    const record::Axes& m_axes;
    bool m_both_ways;
    std::vector<StepLoss> m_steps;
    BathMeans m_means;
    double m_length_m = 1.0, m_scale = 1.0, m_c_variance = 0.0;
    Eigen::Index m_unknowns = 0;
    Eigen::MatrixXd m_normal, m_inverse, m_from_reference;
    Eigen::VectorXd m_right, m_middle, m_share;
};

} // namespace

Adjustment adjust_raman(const record::Source& source, const std::vector<AdjustBath>& baths,
                        double response_m) {
    using record::Quantity;
    if (!source.has(Quantity::stokes) || !source.has(Quantity::antistokes))
        throw DataError{"[adjust] method = \"raman\" needs Stokes and anti-Stokes powers; name "
                        "stokes_column and antistokes_column in [record.text], or stokes and "
                        "antistokes in [record.grid]"};
    const bool both_ways =
        source.has(Quantity::reverse_stokes) && source.has(Quantity::reverse_antistokes);
    Warnings warnings;
    std::vector<StepLoss> steps;
    if (!both_ways)
        steps = find_step_losses(source, baths, response_m, warnings);
    Adjustment out = RamanFit{source, baths, both_ways, std::move(steps)}.run();
    out.warnings.insert(out.warnings.begin(), warnings.begin(), warnings.end());
    return out;
}

} // namespace rillstrand::quality

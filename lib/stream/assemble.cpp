// SPDX-License-Identifier: Apache-2.0
#include "stream/assemble.hpp"

#include "stream/chain.hpp"
#include "stream/diffuse.hpp"
#include "stream/discharge.hpp"
#include "stream/regime.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
// plumes are no exact exponentials: error of their beginning over their length, chosen here
constexpr double shape_error = 0.12;
constexpr double power_z = 1.644854; // 95 % power, one-sided normal

struct Place {
    double at = 0.0, sd = 0.0, low = 0.0, high = 0.0;
};

double finite_mean(const Eigen::ArrayXd& x) {
    const auto n = x.isFinite().count();
    return n > 0 ? x.isFinite().select(x, 0.0).sum() / double(n) : nan;
}

void set_place(const Frame& frame, const Place& place, Inflow& inflow) {
    inflow.fibre_m = frame.fibre_at(place.at);
    inflow.fibre_sd_m = place.sd;
    const double a = frame.fibre_at(place.low), b = frame.fibre_at(place.high);
    inflow.fibre_from_m = std::min(a, b);
    inflow.fibre_to_m = std::max(a, b);
}

/// Contrast, temperature and mean step of an inflow at a place.
void set_temperature(const Context& c, double at_m, Inflow& inflow) {
    inflow.temperature_c = inflow.temperature_sd_c = inflow.contrast_c = inflow.anomaly_c = nan;
    if (!c.inflow_degC)
        return;
    const Eigen::ArrayXd water = beside(c.frame, at_m, 3.0 * c.frame.response_sd_m, -8.0);
    const Eigen::ArrayXd contrast = *c.inflow_degC - water;
    inflow.temperature_c = finite_mean(*c.inflow_degC);
    inflow.temperature_sd_c = c.inflow_sd_K;
    inflow.contrast_c = finite_mean(contrast.abs());
    if (std::isfinite(inflow.fraction))
        inflow.anomaly_c = inflow.fraction * finite_mean(contrast);
}

/// Steps that lie closer than a plume's length and undo part of one another are one inflow whose
/// plume has another shape than an exponential: their sizes are added.
std::vector<double> add_undoing(Context& c) {
    const Estimate e = estimate(c.frame, c.solution.reading, c.solution.pieces);
    std::vector<bool> gone(c.judged.size(), false);
    std::vector<double> moved(c.judged.size(), 0.0);
    for (std::size_t b = 0; b < c.judged.size(); ++b) {
        const Piece& down = c.solution.pieces[c.judged[b].piece];
        if (c.judged[b].verdict != Verdict::unexplained || down.type != Piece::Type::step)
            continue;
        for (std::size_t a = 0; a < c.judged.size(); ++a) {
            Judged& up = c.judged[a];
            const Piece& piece = c.solution.pieces[up.piece];
            if (up.verdict != Verdict::inflow || gone[b] ||
                std::abs(piece.at_m - down.at_m) > 25.0 || up.value < -c.judged[b].value)
                continue;
            const auto i = static_cast<Eigen::Index>(up.piece);
            const auto k = static_cast<Eigen::Index>(c.judged[b].piece);
            up.value += c.judged[b].value;
            up.sd = std::sqrt(std::max(1e-12, e.covariance(i, i) + e.covariance(k, k) +
                                                  2.0 * e.covariance(i, k)));
            moved[a] += c.judged[b].value;
            gone[b] = true;
        }
    }
    std::vector<Judged> kept;
    std::vector<double> kept_moved;
    for (std::size_t k = 0; k < c.judged.size(); ++k)
        if (!gone[k]) {
            kept.push_back(c.judged[k]);
            kept_moved.push_back(moved[k]);
        }
    c.judged = std::move(kept);
    return kept_moved;
}

/// d(share) by an error of the inflow temperature alone.
double share_sd_by_source(const Context& c, double at_m, double share) {
    const Weighting& w = c.solution.reading.weighting;
    Eigen::Index j = 0;
    (c.frame.place_m - (at_m - 4.0 * c.frame.response_sd_m)).abs().minCoeff(&j);
    return std::abs(share * w.total * c.inflow_sd_K / c.solution.reading.profile.contrast[j]);
}

std::string artefact_name(Verdict verdict) {
    switch (verdict) {
    case Verdict::loss:
        return "step loss";
    case Verdict::sun:
        return "sun or shade";
    case Verdict::dry:
        return "dry cable";
    case Verdict::damped:
        return "buried cable";
    case Verdict::unexplained:
        return "unexplained step";
    default:
        return "local";
    }
}

void add_artefact(const Context& c, const Judged& judged, StreamFindings& findings) {
    const Piece& piece = c.solution.pieces[judged.piece];
    Artefact artefact;
    artefact.kind = artefact_name(judged.verdict);
    const double a = c.frame.fibre_at(piece.at_m);
    const double b = piece.type == Piece::Type::box ? c.frame.fibre_at(piece.to_m) : a;
    artefact.from_m = std::min(a, b);
    artefact.to_m = std::max(a, b);
    artefact.size_c = judged.mean_step_K;
    if (piece.type == Piece::Type::step)
        artefact.size_c = (beside(c.frame, piece.at_m, 3.0 * c.frame.response_sd_m, 8.0) -
                           beside(c.frame, piece.at_m, 3.0 * c.frame.response_sd_m, -8.0))
                              .mean();
    for (const std::string& why : judged.why)
        artefact.text += (artefact.text.empty() ? "" : " ") + why;
    findings.artefacts.push_back(std::move(artefact));
}

void add_step(const Context& c, const Judged& judged, bool added_to, const Whitener& whitener,
              double excess, StreamFindings& findings, std::vector<Gain>& gains) {
    const Piece& piece = c.solution.pieces[judged.piece];
    const StepPosterior posterior =
        locate_step(c.frame.place_m, c.solution.reading.profile.value, whitener, c.solution.pieces,
                    judged.piece, c.frame.response_sd_m, c.solution.levels.reach_m);
    Inflow inflow;
    inflow.kind = Kind::step;
    const double scale = std::sqrt(excess);
    set_place(c.frame,
              {posterior.at_m,
               std::hypot(posterior.at_sd_m * scale, shape_error * posterior.mixing_m),
               posterior.low_m, posterior.high_m},
              inflow);
    const double value = added_to ? judged.value : posterior.value;
    const double sd =
        added_to ? std::hypot(judged.sd, 0.1 * judged.value) : posterior.value_sd * scale;
    inflow.fraction = 1.0 - std::exp(-value);
    const double own_sd = std::exp(-value) * sd;
    inflow.fraction_sd = std::hypot(own_sd, share_sd_by_source(c, piece.at_m, inflow.fraction));
    inflow.mixing_length_m = posterior.mixing_m;
    inflow.score = std::max(piece.score, std::abs(value) / sd);
    set_temperature(c, piece.at_m, inflow);
    inflow.evidence = judged.why;
    inflow.evidence.insert(
        inflow.evidence.begin(),
        "The stream stays changed below: " + text::fixed(100.0 * inflow.fraction, 1) + " % +- " +
            text::fixed(100.0 * inflow.fraction_sd, 1) + " % of the discharge.");
    if (posterior.mixing_m > 0.0)
        inflow.evidence.push_back("It mixes in over some " + text::fixed(posterior.mixing_m, 0) +
                                  " m (e-folding length).");
    if (judged.constant_untold)
        findings.cautions.push_back(
            "Inflow at " + text::fixed(inflow.fibre_m, 1) +
            " m: the contrast changes too little to tell it from a constant "
            "loss of the fibre.");
    const double sure = 2.0; // standard deviations, place and mixing left open
    if (!(inflow.score >= findings.threshold_z) || !(value > sure * sd)) {
        Judged doubtful = judged;
        doubtful.verdict = Verdict::local;
        doubtful.why.push_back(
            "With its place and mixing left open the step is not larger than its error.");
        add_artefact(c, doubtful, findings);
        return;
    }
    gains.push_back(
        {posterior.at_m, posterior.at_m, value, inflow.fraction_sd / (1.0 - inflow.fraction)});
    findings.inflows.push_back(std::move(inflow));
}

void add_spot(const Context& c, const Judged& judged, StreamFindings& findings) {
    const Piece& piece = c.solution.pieces[judged.piece];
    Inflow inflow;
    inflow.kind = Kind::spot;
    const double middle = 0.5 * (piece.at_m + piece.to_m);
    const double sd = std::hypot(c.frame.spacing_m() / std::sqrt(12.0),
                                 c.frame.response_sd_m / std::max(1.0, judged.value / judged.sd));
    set_place(c.frame, {middle, sd, piece.at_m, piece.to_m}, inflow);
    inflow.fraction = inflow.fraction_sd = nan;
    inflow.score = std::abs(judged.value) / judged.sd;
    set_temperature(c, piece.at_m, inflow);
    inflow.anomaly_c = judged.mean_step_K;
    inflow.evidence = judged.why;
    findings.inflows.push_back(std::move(inflow));
}

/// Artefacts that touch are one.
void merge_artefacts(std::vector<Artefact>& list) {
    std::sort(list.begin(), list.end(),
              [](const Artefact& a, const Artefact& b) { return a.from_m < b.from_m; });
    std::vector<Artefact> out;
    for (Artefact& a : list) {
        const bool wide = a.to_m > a.from_m;
        if (wide && !out.empty() && out.back().to_m > out.back().from_m &&
            a.from_m <= out.back().to_m + 1.0) {
            if (std::abs(a.size_c) > std::abs(out.back().size_c)) {
                out.back().kind = a.kind;
                out.back().size_c = a.size_c;
                out.back().text = a.text;
            }
            out.back().to_m = std::max(out.back().to_m, a.to_m);
        } else {
            out.push_back(std::move(a));
        }
    }
    list = std::move(out);
}

/// A spot that lies within an artefact, or beside a step's plume, is no finding of its own; spots
/// that touch are one.
void thin_spots(std::vector<Inflow>& inflows, const std::vector<Artefact>& artefacts) {
    std::vector<Inflow> out;
    for (Inflow& inflow : inflows) {
        if (inflow.kind == Kind::spot) {
            const bool inside =
                std::any_of(artefacts.begin(), artefacts.end(), [&](const Artefact& a) {
                    return a.to_m > a.from_m && inflow.fibre_to_m > a.from_m - 1.5 &&
                           inflow.fibre_from_m < a.to_m + 1.5 &&
                           a.to_m - a.from_m > inflow.fibre_to_m - inflow.fibre_from_m;
                });
            const bool plume = std::any_of(inflows.begin(), inflows.end(), [&](const Inflow& i) {
                return i.kind == Kind::step &&
                       std::abs(i.fibre_m - inflow.fibre_m) < 3.0 + 1.5 * i.mixing_length_m;
            });
            bool joined = false;
            for (Inflow& before : out)
                if (before.kind == Kind::spot && inflow.fibre_from_m < before.fibre_to_m + 1.5 &&
                    inflow.fibre_to_m > before.fibre_from_m - 1.5) {
                    if (inflow.score > before.score)
                        before = inflow;
                    joined = true;
                    break;
                }
            if (inside || plume || joined)
                continue;
        }
        out.push_back(inflow);
    }
    inflows = std::move(out);
}

/// Share of declared surface water from its own series, each weighting tried.
void add_declared(const Context& c, const Judged& judged, StreamFindings& findings,
                  std::vector<Gain>& gains) {
    const Piece& piece = c.solution.pieces[judged.piece];
    const KnownWater* water = nullptr;
    double nearest = std::numeric_limits<double>::infinity();
    for (const KnownWater& k : c.input.known) {
        const double far = std::abs((k.fibre_m - c.frame.origin_m) * c.frame.sign - piece.at_m);
        if (far < nearest) {
            nearest = far;
            water = &k;
        }
    }
    if (water == nullptr)
        return;
    Inflow inflow;
    inflow.known = true;
    inflow.label = water->label;
    set_place(c.frame, {piece.at_m, 1.0, piece.at_m - 2.0, piece.at_m + 2.0}, inflow);
    inflow.fraction = inflow.fraction_sd = inflow.temperature_c = inflow.temperature_sd_c = nan;
    inflow.contrast_c = inflow.anomaly_c = nan;
    inflow.score = std::abs(judged.value) / judged.sd;
    if (!water->temperature_degC) {
        inflow.evidence.push_back(
            "Declared surface water without a temperature of its own: its share "
            "cannot be told.");
        findings.inflows.push_back(std::move(inflow));
        return;
    }
    const Eigen::ArrayXd series = at_times(*water->temperature_degC, c.frame.time_s);
    const Eigen::ArrayXd above = beside(c.frame, piece.at_m, 3.0 * c.frame.response_sd_m, -8.0);
    const Eigen::ArrayXd contrast = series - above;
    inflow.temperature_c = finite_mean(series);
    inflow.temperature_sd_c = 0.1; // heat gained on the way, chosen here
    inflow.contrast_c = finite_mean(contrast.abs());
    double best_sd = std::numeric_limits<double>::infinity(), best_value = nan;
    if (series.isFinite().count() * 2 >= series.size())
        for (const Weighting& w : make_weightings(c.frame, c.patterns, series)) {
            const Reading reading = read(c.frame, w, c.solution.pieces);
            const Estimate e = estimate(c.frame, reading, c.solution.pieces);
            const auto k = static_cast<Eigen::Index>(judged.piece);
            const double share = 1.0 - std::exp(-e.value[k]);
            const double sd = std::hypot(std::exp(-e.value[k]) * e.sd[k],
                                         share * w.total * inflow.temperature_sd_c);
            if (sd < best_sd) {
                best_sd = sd;
                best_value = e.value[k];
            }
        }
    const double share = 1.0 - std::exp(-best_value);
    const bool alike = !(inflow.contrast_c > 0.15) || !(best_sd < 0.25);
    if (alike || share < -2.0 * best_sd) {
        inflow.evidence.push_back(
            "Not resolvable here: the two arms are too alike (mean difference " +
            text::fixed(inflow.contrast_c, 2) +
            " K) or the step does not fit the given temperature.");
    } else {
        inflow.fraction = share;
        inflow.fraction_sd = best_sd;
        inflow.score = std::abs(share) / best_sd;
        inflow.anomaly_c = share * finite_mean(contrast);
        inflow.evidence.push_back(
            "Share from its own temperature series: " + text::fixed(100.0 * share, 1) + " % +- " +
            text::fixed(100.0 * best_sd, 1) + " %.");
        gains.push_back(
            {piece.at_m, piece.at_m, best_value, best_sd / std::max(0.05, 1.0 - share)});
    }
    findings.inflows.push_back(std::move(inflow));
}

void add_diffuse(const Context& c, StreamFindings& findings, std::vector<Gain>& gains) {
    for (const DiffuseGain& gain : find_diffuse(c)) {
        Inflow inflow;
        inflow.kind = Kind::diffuse;
        const double middle = 0.5 * (gain.from_m + gain.to_m);
        set_place(c.frame, {middle, 0.2 * (gain.to_m - gain.from_m), gain.from_m, gain.to_m},
                  inflow);
        inflow.fraction = 1.0 - std::exp(-gain.value);
        inflow.fraction_sd = std::hypot(std::exp(-gain.value) * gain.sd,
                                        share_sd_by_source(c, middle, inflow.fraction));
        inflow.score = gain.score;
        set_temperature(c, middle, inflow);
        inflow.evidence.push_back("The stream's slope follows the contrast over " +
                                  text::fixed(gain.to_m - gain.from_m, 0) +
                                  " m beyond what sun, air and travel time explain.");
        gains.push_back({gain.from_m, gain.to_m, gain.value, gain.sd});
        findings.inflows.push_back(std::move(inflow));
    }
}

std::vector<Gauged> gaugings(const Context& c, StreamFindings& findings) {
    std::vector<Gauged> out;
    const campaign::Stream& config = c.input.config;
    double q = config.discharge_m3s.value_or(nan);
    if (c.input.discharge_m3s)
        q = finite_mean(at_times(*c.input.discharge_m3s, c.frame.time_s));
    const double usual_error = 0.05; // current-meter gauging, common practice, no source
    if (q > 0.0) {
        const double end = c.frame.place_m[c.frame.n_place() - 1];
        const double sd = config.discharge_sd_m3s.value_or(usual_error * q);
        if (!config.discharge_sd_m3s)
            findings.cautions.push_back(
                "No standard deviation of the discharge was given; 5 % was taken.");
        out.push_back(
            {config.discharge_at == campaign::DischargeAt::upstream ? -1.0 : end + 1.0, q, sd});
    }
    for (const campaign::Gauging& g : config.gauging)
        if (g.discharge_m3s > 0.0)
            out.push_back(
                {(g.fibre_m - c.frame.origin_m) * c.frame.sign, g.discharge_m3s,
                 g.discharge_sd_m3s > 0.0 ? g.discharge_sd_m3s : usual_error * g.discharge_m3s});
    return out;
}

void set_discharge(const Context& c, const std::vector<Gain>& gains,
                   const std::vector<std::size_t>& owner, StreamFindings& findings) {
    for (Inflow& inflow : findings.inflows)
        inflow.discharge_m3s = inflow.discharge_sd_m3s = nan;
    const Eigen::Index all = c.input.fibre_m.size();
    findings.channels.discharge_m3s = findings.channels.discharge_sd_m3s =
        Eigen::ArrayXd::Constant(all, nan);
    const std::vector<Gauged> gauged = gaugings(c, findings);
    if (gauged.empty())
        return;
    const Eigen::ArrayXd place = (c.input.fibre_m - c.frame.origin_m) * c.frame.sign;
    const DischargeLine line = discharge_line(place, gains, gauged);
    findings.channels.discharge_m3s = line.discharge_m3s;
    findings.channels.discharge_sd_m3s = line.sd_m3s;
    for (std::size_t k = 0; k < owner.size(); ++k) {
        findings.inflows[owner[k]].discharge_m3s = line.gain_m3s[static_cast<Eigen::Index>(k)];
        findings.inflows[owner[k]].discharge_sd_m3s =
            line.gain_sd_m3s[static_cast<Eigen::Index>(k)];
    }
    for (Closure closure : closures(gains, gauged)) {
        closure.from_m = c.frame.fibre_at(closure.from_m);
        closure.to_m = c.frame.fibre_at(closure.to_m);
        closure.text = "Between " + text::fixed(closure.from_m, 0) + " m and " +
                       text::fixed(closure.to_m, 0) + " m: " + closure.text;
        findings.closures.push_back(std::move(closure));
    }
}

void set_channels(const Context& c, StreamFindings& findings) {
    const Eigen::Index all = c.input.fibre_m.size();
    StreamChannels& out = findings.channels;
    out.fibre_m = c.input.fibre_m;
    out.background_c = out.anomaly_c = out.detection_limit_fraction = out.sevendadm_c =
        out.noise_c = Eigen::ArrayXd::Constant(all, nan);
    const Frame& f = c.frame;
    const Reading& reading = c.solution.reading;
    const Eigen::ArrayXd sd = step_sd(f.place_m, reading.whitener(f), c.solution.pieces,
                                      f.response_sd_m, c.solution.levels.reach_m);
    const double excess = std::sqrt(estimate(f, reading, c.solution.pieces).excess);
    const Eigen::ArrayXd means = f.water_degC.colwise().mean().transpose();
    Eigen::ArrayXd calm = means; // boxes bridged by the straight line between their edges
    for (const Piece& piece : c.solution.pieces) {
        if (piece.type != Piece::Type::box)
            continue;
        const double margin = 3.0 * f.response_sd_m;
        const double above = beside(f, piece.at_m, margin, -4.0).mean();
        const double below = beside(f, piece.to_m, margin, 4.0).mean();
        for (Eigen::Index j = 0; j < f.n_place(); ++j) {
            const double x = f.place_m[j];
            if (x < piece.at_m - margin || x > piece.to_m + margin)
                continue;
            const double t =
                std::clamp((x - piece.at_m) / std::max(0.1, piece.to_m - piece.at_m), 0.0, 1.0);
            calm[j] = above + t * (below - above);
        }
    }
    std::vector<double> limits;
    for (Eigen::Index j = 0; j < f.n_place(); ++j) {
        const Eigen::Index i = f.channel[static_cast<std::size_t>(j)];
        double sum = 0.0, n = 0.0;
        for (Eigen::Index k = std::max<Eigen::Index>(0, j - 4); k < std::min(f.n_place(), j + 5);
             ++k) {
            sum += calm[k];
            n += 1.0;
        }
        out.background_c[i] = sum / n;
        out.anomaly_c[i] = means[j] - out.background_c[i];
        out.noise_c[i] = f.white_K[j];
        const double limit = 1.0 - std::exp(-(findings.threshold_z + power_z) * sd[j] * excess);
        if (std::isfinite(limit) && limit < 0.5) {
            out.detection_limit_fraction[i] = limit;
            limits.push_back(limit);
        }
    }
    findings.detection_limit_median = median(std::move(limits));
}

void set_regime(const Context& c, StreamFindings& findings) {
    const StreamInput& in = c.input;
    const double offset_s = in.longitude_deg.value_or(0.0) * 240.0;
    const Eigen::Index all = in.fibre_m.size();
    Eigen::ArrayXd usable = Eigen::ArrayXd::Zero(all);
    for (const Eigen::Index i : c.frame.channel)
        usable[i] = 1.0;
    for (const Eigen::Index i : c.frame.channel)
        findings.channels.sevendadm_c[i] =
            seven_day_maximum_degC(in.time_s, in.interval_s, in.temperature_degC.col(i), offset_s);
    for (const double threshold : in.config.regime.hours_above_c) {
        Eigen::ArrayXd hours = Eigen::ArrayXd::Constant(all, nan);
        for (const Eigen::Index i : c.frame.channel)
            hours[i] = hours_above(in.temperature_degC.col(i), threshold, in.interval_s);
        findings.channels.hours_above.push_back(std::move(hours));
    }
    if (in.config.regime.refuge_colder_by_c)
        findings.refuges = find_refuges(in, usable, *in.config.regime.refuge_colder_by_c, offset_s);
}

void say_limits(const Context& c, StreamFindings& findings) {
    const double limit = findings.detection_limit_median;
    if (std::isfinite(limit))
        findings.evidence.push_back("An inflow of " + text::fixed(100.0 * limit, 2) +
                                    " % of the discharge would have been found with 95 % power at "
                                    "half of the channels; the layer has the limit at each.");
    else
        findings.cautions.push_back(
            "Not resolvable here: contrast and noise let no share under one half "
            "be seen; try another season or a longer record.");
    findings.cautions.push_back(
        "Water that is lost from the stream leaves its temperature as it is: "
        "losses are invisible here unless two gaugings bracket them.");
    if (double(c.frame.n_time()) * c.frame.interval_s < 86400.0)
        findings.cautions.push_back(
            "The record is shorter than a day: sun, shade and losses can hardly be "
            "told from inflows.");
    for (const Exclusion& e : c.frame.dropped)
        findings.cautions.push_back("Channels from " + text::fixed(e.from_m, 1) + " m to " +
                                    text::fixed(e.to_m, 1) + " m were set aside: " + e.reason +
                                    ".");
}

} // namespace

void assemble(const Context& context, StreamFindings& findings) {
    Context c = context;
    const std::vector<double> added = add_undoing(c);
    const Reading& reading = c.solution.reading;
    const Whitener whitener = reading.whitener(c.frame);
    const double excess = estimate(c.frame, reading, c.solution.pieces).excess;
    std::vector<Gain> gains;
    std::vector<std::size_t> owner;
    const auto note_owner = [&]() {
        while (owner.size() < gains.size())
            owner.push_back(findings.inflows.size() - 1);
    };
    for (std::size_t k = 0; k < c.judged.size(); ++k) {
        const Judged& judged = c.judged[k];
        if (judged.verdict == Verdict::inflow)
            add_step(c, judged, added[k] != 0.0, whitener, excess, findings, gains);
        else if (judged.verdict == Verdict::declared)
            add_declared(c, judged, findings, gains);
        else if (judged.verdict == Verdict::spot)
            add_spot(c, judged, findings);
        else
            add_artefact(c, judged, findings);
        note_owner();
    }
    add_diffuse(c, findings, gains);
    note_owner();
    join_chains(c.frame, findings.inflows, gains, owner);
    merge_artefacts(findings.artefacts);
    set_channels(c, findings);
    set_discharge(c, gains, owner, findings);
    thin_spots(findings.inflows, findings.artefacts);
    set_regime(c, findings);
    say_limits(c, findings);
    std::sort(findings.inflows.begin(), findings.inflows.end(),
              [&](const Inflow& a, const Inflow& b) {
                  return a.fibre_m * c.frame.sign < b.fibre_m * c.frame.sign;
              });
}

} // namespace rillstrand::stream

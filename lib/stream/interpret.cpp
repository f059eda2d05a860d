// SPDX-License-Identifier: Apache-2.0
#include "stream/assemble.hpp"
#include "stream/diffuse.hpp"
#include "stream/regime.hpp"
#include "stream/report.hpp"
#include "stream/source.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::stream {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double family = 0.05; // chance that a reach without inflow reports any

/// The inflow temperature that was given, at the frame's times.
std::optional<Eigen::ArrayXd> given_temperature(const StreamInput& input, const Frame& frame,
                                                StreamFindings& findings) {
    if (input.inflow_temperature_degC) {
        Eigen::ArrayXd series = at_times(*input.inflow_temperature_degC, frame.time_s);
        const auto there = series.isFinite().count();
        if (there * 2 >= series.size())
            return series;
        findings.cautions.push_back("The series of inflow temperatures covers only " +
                                    std::to_string(there) + " of " + std::to_string(series.size()) +
                                    " times and was not used.");
    }
    if (input.config.inflow_temperature_c)
        return Eigen::ArrayXd::Constant(frame.n_time(), *input.config.inflow_temperature_c);
    return std::nullopt;
}

std::vector<Piece> declared_pieces(const StreamInput& input, const Frame& frame,
                                   StreamFindings& findings) {
    std::vector<Piece> out;
    for (const KnownWater& known : input.known) {
        Piece piece;
        piece.at_m = (known.fibre_m - frame.origin_m) * frame.sign;
        piece.declared = true;
        const double end = frame.place_m[frame.n_place() - 1];
        if (piece.at_m <= frame.place_m[0] || piece.at_m >= end) {
            findings.cautions.push_back("'" + known.label + "' at fibre distance " +
                                        text::number(known.fibre_m) +
                                        " m lies outside the usable reach and was left out.");
            continue;
        }
        out.push_back(piece);
    }
    return out;
}

void say_source(const SourceTemperature& source, StreamFindings& findings) {
    if (!source.found)
        return;
    findings.evidence.push_back(
        "Inflow temperature from " + std::to_string(source.count) + " inflows: " +
        text::fixed(source.degC, 2) + " +- " + text::fixed(source.sd_K, 2) + " degC" +
        (source.count > 1 ? " (chi-square " + text::fixed(source.chi2, 1) + " on " +
                                std::to_string(source.count - 1) + " degrees of freedom)."
                          : "."));
    if (!source.apart.empty())
        findings.cautions.push_back(std::to_string(source.apart.size()) +
                                    " inflows have a temperature of their own; they may be surface "
                                    "water.");
}

/// Given temperature against what the record says by itself.
void test_clash(const Frame& frame, const Patterns& patterns, const Solution& solution,
                const std::vector<Judged>& judged, double given_degC, double given_sd_K,
                StreamFindings& findings) {
    const Reading* free = nullptr;
    for (const Reading& r : solution.readings)
        if (shuts_constants_out(r.weighting) && (free == nullptr || r.usual_sd < free->usual_sd))
            free = &r;
    if (free == nullptr || solution.pieces.empty())
        return;
    Solution by_changes = solution;
    by_changes.reading = *free;
    const Estimate changes = estimate(frame, *free, solution.pieces);
    std::vector<Judged> own = judged;
    for (Judged& j : own) {
        j.value = changes.value[static_cast<Eigen::Index>(j.piece)];
        j.sd = changes.sd[static_cast<Eigen::Index>(j.piece)];
    }
    const SourceTemperature source = source_temperature(frame, patterns, by_changes, own);
    if (!source.found)
        return;
    say_source(source, findings);
    const double gap = source.degC - given_degC;
    const double sd = std::hypot(source.sd_K, given_sd_K);
    if (std::abs(gap) > 3.5 * sd)
        findings.cautions.push_back(
            "The inflow temperature that was given, " + text::fixed(given_degC, 2) +
            " degC, does not fit the record, which says " + text::fixed(source.degC, 2) + " +- " +
            text::fixed(source.sd_K, 2) +
            " degC; shares follow the one given, so check it or leave the key out.");
}

} // namespace

StreamFindings interpret(const StreamInput& input) {
    StreamFindings findings;
    findings.stretch = input.config.stretch;
    findings.family_level = family;
    const Frame frame = make_frame(input);
    const Patterns patterns = make_patterns(frame, input);
    const std::vector<Piece> declared = declared_pieces(input, frame, findings);
    findings.noise_c = median({frame.white_K.begin(), frame.white_K.end()});
    findings.drift_c = frame.jitter_K;

    Context context{input, frame, patterns, {}, 0.0, {}, {}, {}};
    context.inflow_degC = given_temperature(input, frame, findings);
    findings.inflow_temperature_given = context.inflow_degC.has_value();
    context.inflow_sd_K =
        context.inflow_degC ? input.config.inflow_temperature_sd_c.value_or(0.0) : 0.0;
    context.solution = solve(frame, make_weightings(frame, patterns, context.inflow_degC), declared,
                             family, context.inflow_sd_K);
    context.judged = judge(frame, patterns, context.solution, context.inflow_degC);
    if (context.inflow_degC) {
        const Eigen::ArrayXd& t = *context.inflow_degC;
        findings.inflow_temperature_c =
            t.isFinite().select(t, 0.0).sum() / double(t.isFinite().count());
        findings.inflow_temperature_sd_c = context.inflow_sd_K;
        test_clash(frame, patterns, context.solution, context.judged, findings.inflow_temperature_c,
                   context.inflow_sd_K, findings);
    } else {
        context.source = source_temperature(frame, patterns, context.solution, context.judged);
        findings.inflow_temperature_c = nan;
        findings.inflow_temperature_sd_c = nan;
        say_source(context.source, findings);
        if (context.source.found && context.source.sd_K < 2.0) {
            // with it known so well, the mean helps too: once more as if it were given
            context.inflow_degC = Eigen::ArrayXd::Constant(frame.n_time(), context.source.degC);
            context.inflow_sd_K = context.source.sd_K;
            context.solution = solve(frame, make_weightings(frame, patterns, context.inflow_degC),
                                     declared, family, context.inflow_sd_K);
            context.judged = judge(frame, patterns, context.solution, context.inflow_degC);
            findings.inflow_temperature_c = context.source.degC;
            findings.inflow_temperature_sd_c = context.source.sd_K;
        }
    }
    findings.threshold_z = std::sqrt(context.solution.levels.step_gain);
    assemble(context, findings);
    findings.method = method_text(frame, context.solution, findings);
    rank(findings.inflows);
    return findings;
}

} // namespace rillstrand::stream

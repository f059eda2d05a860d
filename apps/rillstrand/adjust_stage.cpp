// SPDX-License-Identifier: Apache-2.0
#include "adjust_stage.hpp"

#include "base/text.hpp"
#include "record/side_series.hpp"
#include "store/canonical.hpp"
#include "store/open.hpp"

#include <algorithm>

namespace rillstrand::app {

namespace {

std::vector<quality::AdjustBath> adjust_baths(const Session& session) {
    std::vector<quality::AdjustBath> baths;
    for (const auto& bath : session.campaign.baths) {
        if (bath.use != campaign::BathUse::adjust)
            continue;
        quality::AdjustBath ready{bath.name,
                                  quality::inner_places(session.axes(), bath.from_m, bath.to_m,
                                                        session.spatial_response_m),
                                  bath_reference(session, bath)};
        if (ready.places.count == 0)
            throw DataError{session.campaign.place(bath.where) + ": bath '" + bath.name +
                            "' holds no channel of the record; correct from_m and to_m"};
        if (!ready.reference.temperature_degC.isFinite().any())
            throw DataError{session.campaign.place(bath.where) + ": the probe of bath '" +
                            bath.name +
                            "' has no value at any time of the record; check its times "
                            "and record.time_zone"};
        baths.push_back(std::move(ready));
    }
    return baths;
}

/// Writes a record as the canonical store.
void write_record(const record::Source& source, const std::filesystem::path& path,
                  const std::string& history, Progress& progress) {
    using record::Quantity;
    const record::Axes& axes = source.axes();
    store::CanonicalHead head;
    head.distance_m = axes.distance_m;
    head.interval_s = axes.interval_s;
    head.source = "fibre-optic distributed temperature measurement, adjusted to reference baths";
    head.history = history;
    for (const Quantity quantity : {Quantity::stokes, Quantity::antistokes,
                                    Quantity::reverse_stokes, Quantity::reverse_antistokes})
        if (source.has(quantity))
            head.quantities.push_back(quantity);
    store::CanonicalWriter writer{path, head};
    const Eigen::Index rows_at_once = std::clamp<Eigen::Index>(source.block_rows(), 1, 288);
    progress.stage("writing the adjusted record", static_cast<double>(axes.n_time()), "traces");
    for (Eigen::Index i = 0; i < axes.n_time(); i += rows_at_once) {
        const Eigen::Index rows = std::min(rows_at_once, axes.n_time() - i);
        std::vector<Eigen::ArrayXXf> blocks;
        blocks.reserve(head.quantities.size());
        for (const Quantity quantity : head.quantities) {
            blocks.emplace_back(rows, axes.n_place());
            source.read(quantity, i, 0, blocks.back());
        }
        for (Eigen::Index r = 0; r < rows; ++r) {
            std::vector<Eigen::ArrayXf> row;
            row.reserve(blocks.size());
            for (const auto& block : blocks)
                row.emplace_back(block.row(r).transpose());
            writer.add_row(axes.time_s(i + r), row);
        }
        progress.advance(static_cast<double>(rows));
    }
    writer.finish();
}

const char* method_word(campaign::AdjustMethod method) {
    switch (method) {
    case campaign::AdjustMethod::offset:
        return "offset";
    case campaign::AdjustMethod::offset_and_slope:
        return "offset-and-slope";
    case campaign::AdjustMethod::raman:
        break;
    }
    return "raman";
}

} // namespace

quality::BathReference bath_reference(const Session& session, const campaign::Bath& bath) {
    const record::Axes& axes = session.axes();
    if (bath.temperature_c)
        return quality::constant_reference(axes.n_time(), *bath.temperature_c,
                                           bath.temperature_sd_c);
    const auto series = record::read_side_series(*bath.probe, session.campaign.record);
    return {record::mean_over_intervals(series, axes.time_s, axes.interval_s,
                                        record::usual_gap_s(series)),
            bath.temperature_sd_c};
}

void adjust_stage(Session& session, const Output& output, const Context& context) {
    if (!session.campaign.adjust)
        return;
    const auto baths = adjust_baths(session);
    context.progress.stage("adjusting to the baths", static_cast<double>(baths.size()), "baths");
    const campaign::AdjustMethod method = session.campaign.adjust->method;
    try {
        session.adjustment =
            method == campaign::AdjustMethod::raman
                ? quality::adjust_raman(*session.source, baths, session.spatial_response_m)
                : quality::adjust_offset(*session.source, baths,
                                         method == campaign::AdjustMethod::offset_and_slope,
                                         session.spatial_response_m);
    } catch (const DataError& error) {
        throw DataError{session.campaign.place(session.campaign.adjust->where) + ": " +
                        error.what()};
    }
    const Warnings& warnings = session.adjustment->warnings;
    session.warnings.insert(session.warnings.end(), warnings.begin(), warnings.end());
    const std::filesystem::path record_nc = output.staging() / "record.nc",
                                adjusted_nc = output.staging() / "record.adjusted.nc";
    write_record(*quality::adjusted(*session.source, *session.adjustment), adjusted_nc,
                 context.now + " gathered and adjusted (" + method_word(method) +
                     ") by rillstrand " RILLSTRAND_VERSION,
                 context.progress);
    session.source.reset();
    std::filesystem::rename(adjusted_nc, record_nc);
    session.source = store::open_canonical(record_nc);
}

Json adjustment_json(const Session& session) {
    if (!session.adjustment)
        return nullptr;
    const quality::Adjustment& how = *session.adjustment;
    Json steps = Json::array();
    for (const auto& step : how.steps)
        steps.push_back({{"fibre_m", number_json(step.at_m)},
                         {"log_ratio", number_json(step.size)},
                         {"log_ratio_sd", number_json(step.size_sd)},
                         {"apparent_c", number_json(step.apparent_K)}});
    Json json{{"method", method_word(how.method)},
              {"double_ended", how.double_ended},
              {"temperature_sd_c", number_json(how.channel_sd_K.maxCoeff())},
              {"steps", steps}};
    if (how.method == campaign::AdjustMethod::raman) {
        json["gamma_k"] = number_json(how.gamma_K);
        json["gamma_sd_k"] = number_json(how.gamma_sd_K);
        json["dalpha_1_m"] = number_json(how.dalpha_1_m);
        json["dalpha_sd_1_m"] = number_json(how.dalpha_sd_1_m);
    } else {
        json["offset_c"] = number_json(how.offset_K.mean());
        json["slope_c_m"] = number_json(how.slope_K_m.mean());
    }
    return json;
}

void tell_adjustment(const Session& session, std::ostream& out) {
    if (!session.adjustment)
        return;
    const quality::Adjustment& how = *session.adjustment;
    out << "adjusted to the baths (" << method_word(how.method) << "), sd of what they leave open "
        << text::fixed(how.channel_sd_K.minCoeff(), 3) << " to "
        << text::fixed(how.channel_sd_K.maxCoeff(), 3) << " K";
    if (how.method == campaign::AdjustMethod::raman)
        out << "; gamma " << text::fixed(how.gamma_K, 1) << " ± " << text::fixed(how.gamma_sd_K, 1)
            << " K";
    out << '\n';
    for (const auto& step : how.steps)
        out << "  loss at " << text::fixed(step.at_m, 1) << " m, uncorrected "
            << text::fixed(step.apparent_K, 2) << " K beyond it\n";
}

} // namespace rillstrand::app

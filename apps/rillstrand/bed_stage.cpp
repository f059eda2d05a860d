// SPDX-License-Identifier: Apache-2.0
#include "bed_stage.hpp"

#include "base/text.hpp"
#include "bed/depths.hpp"
#include "record/bin.hpp"

namespace rillstrand::app {

namespace {

bed::BedInput bed_input(const Session& session, const campaign::Bed& config,
                        const Context& context) {
    const campaign::Stretch& stretch = *session.campaign.find_stretch(config.stretch);
    const record::Axes& axes = session.axes();
    const auto range = record::places_between(axes, stretch.from_m, stretch.to_m);
    // Half an hour follows floods and the day's wave; longer only for memory.
    const double bin_s = record::choose_bin_s(axes, range.count, 1800.0, 300e6);
    const auto binned = record::bin(*session.source, range, bin_s, context.progress);
    std::vector<Eigen::Index> own;
    for (Eigen::Index j = 0; j < range.count; ++j) {
        const auto k = static_cast<std::size_t>(range.first + j);
        if (session.names.stretch[k] == config.stretch && session.names.flag[k] != "dead" &&
            session.names.flag[k] != "noisy")
            own.push_back(j);
    }
    bed::BedInput input;
    input.time_s = binned.time_s;
    input.interval_s = binned.bin_s;
    input.spatial_response_m = session.spatial_response_m;
    input.config = config;
    input.fibre_m.resize(static_cast<Eigen::Index>(own.size()));
    input.temperature_degC.resize(binned.mean_degC.rows(), input.fibre_m.size());
    for (std::size_t k = 0; k < own.size(); ++k) {
        const auto j = static_cast<Eigen::Index>(k);
        input.fibre_m(j) = binned.distance_m(own[k]);
        input.temperature_degC.col(j) = binned.mean_degC.col(own[k]).cast<double>();
    }
    return input;
}

} // namespace

void check_beds(const campaign::Campaign& campaign, const Eigen::ArrayXd& distance_m,
                Problems& problems) {
    std::vector<std::string> slugs;
    for (const auto& bed : campaign.beds) {
        const std::string slug = text::slug(bed.name);
        for (const auto& other : slugs)
            if (other == slug)
                problems.add(campaign.place(bed.where) + ": [[bed]] '" + bed.name +
                             "' and another one would both write table bed_" + slug +
                             "; give them names that differ in letters or digits");
        slugs.push_back(slug);
        const campaign::Stretch* stretch = campaign.find_stretch(bed.stretch);
        if (stretch == nullptr || distance_m.size() == 0)
            continue;
        const auto range =
            record::places_between({{}, 0.0, distance_m}, stretch->from_m, stretch->to_m);
        if (range.count == 0)
            continue; // told with the stretch
        const Eigen::ArrayXd depth_m =
            bed::depths_m(bed, distance_m.segment(range.first, range.count));
        const Eigen::Index below = (depth_m >= -1e-3).count();
        if (below < 2)
            problems.add(campaign.place(bed.where) + ": [[bed]] '" + bed.name +
                         "': " + std::to_string(below) + " of " + std::to_string(range.count) +
                         " channels of stretch '" + bed.stretch +
                         "' lie under the bed's surface at fibre distance " +
                         text::number(bed.datum_fibre_m) +
                         " m, and a flux needs two depths; correct datum_fibre_m, direction or "
                         "the stretch");
    }
}

void bed_stage(Session& session, const Context& context) {
    Problems problems;
    for (const auto& config : session.campaign.beds) {
        const bed::BedInput input = bed_input(session, config, context);
        context.progress.stage("telling the flux through bed '" + config.name + "'",
                               static_cast<double>(input.fibre_m.size()), "channels");
        try {
            session.beds.push_back(bed::interpret(input));
        } catch (const DataError& error) {
            for (const auto& problem : error.problems())
                problems.add(session.campaign.place(config.where) + ": " + problem);
            continue;
        }
        const Warnings& own = session.beds.back().warnings;
        session.warnings.insert(session.warnings.end(), own.begin(), own.end());
    }
    problems.throw_if_any();
}

} // namespace rillstrand::app

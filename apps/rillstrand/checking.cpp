// SPDX-License-Identifier: Apache-2.0
#include "pipeline.hpp"

#include "bed_stage.hpp"
#include "column_stage.hpp"

#include "base/text.hpp"
#include "campaign/read.hpp"
#include "store/gather.hpp"

namespace rillstrand::app {

namespace {

/// Analyses whose keys are known but which nothing carries out yet.
void refuse_unbuilt(const campaign::Campaign& campaign, Problems& problems) {
    const auto refuse = [&](campaign::Where where, const std::string& what) {
        problems.add(campaign.place(where) + ": " + what +
                     " is not built yet; take it out of the campaign file for now");
    };
    for (const auto& stream : campaign.streams)
        if (stream.weather)
            refuse(stream.where, "[stream.weather]");
}

/// Keys that need another one to have an effect.
void check_needs(const campaign::Campaign& campaign, Problems& problems) {
    if (campaign.placement)
        return;
    if (campaign.layers.corridor_m)
        problems.add("layers.corridor_m needs [placement]: without positions there is no corridor");
    if (campaign.page_background)
        problems.add("page.background needs [placement]: without positions there is no map");
}

void check_places(const campaign::Campaign& campaign, const record::Inspection& heads,
                  Problems& problems) {
    if (heads.distance_m.size() == 0)
        return;
    const double first_m = heads.distance_m(0),
                 last_m = heads.distance_m(heads.distance_m.size() - 1);
    const auto check = [&](const std::string& what, const std::string& name, double from_m,
                           double to_m, campaign::Where where) {
        const record::Axes axes{{}, 0.0, heads.distance_m};
        if (record::places_between(axes, from_m, to_m).count > 0)
            return;
        problems.add(
            campaign.place(where) + ": " + what + " '" + name + "' from " + text::number(from_m) +
            " to " + text::number(to_m) + " m holds no channel of the record, which reaches from " +
            text::number(first_m) + " to " + text::number(last_m) + " m; correct from_m and to_m");
    };
    for (const auto& s : campaign.stretches)
        check("stretch", s.name, s.from_m, s.to_m, s.where);
    for (const auto& b : campaign.baths)
        check("bath", b.name, b.from_m, b.to_m, b.where);
}

} // namespace

campaign::Campaign checked_campaign(const std::filesystem::path& file) {
    campaign::Campaign campaign = campaign::read_campaign(file);
    Problems problems;
    refuse_unbuilt(campaign, problems);
    check_needs(campaign, problems);
    check_columns(campaign, problems);
    try {
        const record::Inspection heads = store::inspect(campaign);
        check_places(campaign, heads, problems);
        check_beds(campaign, heads.distance_m, problems);
    } catch (const DataError& error) {
        problems.add(error);
    }
    for (const auto& problem : geo::check_placement(campaign))
        problems.add(problem);
    problems.throw_if_any();
    return campaign;
}

} // namespace rillstrand::app

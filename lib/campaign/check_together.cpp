// SPDX-License-Identifier: Apache-2.0
#include "campaign/read_parts.hpp"

#include "base/text.hpp"

#include <algorithm>

namespace rillstrand::campaign {

namespace {

/// A stretch or a bath, as far as overlaps are concerned.
struct Interval {
    std::string what;
    std::string name;
    double from_m;
    double to_m;
    bool inside_others; ///< coil or bath: may lie wholly inside another stretch
    Where where;
};

std::vector<Interval> intervals_of(const Campaign& campaign) {
    std::vector<Interval> all;
    for (const auto& s : campaign.stretches)
        all.push_back({"stretch", s.name, s.from_m, s.to_m,
                       s.setting == Setting::coil || s.setting == Setting::bath, s.where});
    for (const auto& b : campaign.baths)
        all.push_back({"bath", b.name, b.from_m, b.to_m, true, b.where});
    return all;
}

bool holds(const Interval& outer, const Interval& inner) {
    return outer.from_m <= inner.from_m && inner.to_m <= outer.to_m;
}

void check_overlaps(const Campaign& campaign, Reading& reading) {
    std::vector<Interval> all = intervals_of(campaign);
    std::stable_sort(all.begin(), all.end(),
                     [](const Interval& a, const Interval& b) { return a.from_m < b.from_m; });
    for (std::size_t i = 0; i < all.size(); ++i) {
        for (std::size_t j = i + 1; j < all.size() && all[j].from_m < all[i].to_m; ++j) {
            const Interval& a = all[i];
            const Interval& b = all[j];
            if ((a.inside_others && holds(b, a)) || (b.inside_others && holds(a, b)))
                continue;
            const bool later = b.where.line >= a.where.line;
            const Interval& at = later ? b : a;
            const Interval& other = later ? a : b;
            reading.problem(at.where, at.what + " '" + at.name + "' overlaps " + other.what + " '" +
                                          other.name + "' (line " +
                                          std::to_string(other.where.line) + ") from " +
                                          text::number(std::max(a.from_m, b.from_m)) + " to " +
                                          text::number(std::min(a.to_m, b.to_m)) +
                                          " m; part them, only a coil or bath may lie wholly "
                                          "inside another stretch");
        }
    }
}

template <class Item>
void check_names(const std::vector<Item>& items, const std::string& what, Reading& reading) {
    for (std::size_t i = 0; i < items.size(); ++i)
        for (std::size_t j = 0; j < i; ++j)
            if (text::slug(items[i].name) == text::slug(items[j].name)) {
                reading.problem(items[i].where,
                                what + " '" + items[i].name + "' has the name of the one in line " +
                                    std::to_string(items[j].where.line) +
                                    " (names count without capitals and signs); rename one");
                break;
            }
}

void check_stretch_named(const Campaign& campaign, const std::string& name, Where where,
                         const std::string& what, Reading& reading) {
    if (name.empty() || campaign.find_stretch(name) != nullptr)
        return;
    std::vector<std::string> names;
    for (const auto& stretch : campaign.stretches)
        names.push_back(stretch.name);
    const std::string near = text::nearest(name, names);
    std::string list;
    for (const auto& known : names)
        list += (list.empty() ? "'" : ", '") + known + "'";
    reading.problem(where, what + " names stretch '" + name + "', which there is not; " +
                               (!near.empty()  ? "did you mean '" + near + "'?"
                                : list.empty() ? "add it as [[stretch]]"
                                               : "the stretches are " + list));
}

} // namespace

void check_together(const Campaign& campaign, Reading& reading) {
    check_overlaps(campaign, reading);
    check_names(campaign.stretches, "stretch", reading);
    check_names(campaign.baths, "bath", reading);
    check_names(campaign.columns, "column", reading);
    check_names(campaign.beds, "bed", reading);
    for (const auto& stream : campaign.streams) {
        check_stretch_named(campaign, stream.stretch, stream.where, "[[stream]]", reading);
        for (const auto& known : stream.known)
            if (known.temperature_stretch)
                check_stretch_named(campaign, *known.temperature_stretch, known.where,
                                    "[[stream.known]]", reading);
    }
    for (const auto& snow : campaign.snows)
        check_stretch_named(campaign, snow.stretch, snow.where, "[[snow]]", reading);
    for (const auto& column : campaign.columns)
        check_stretch_named(campaign, column.stretch, column.where, "[[column]]", reading);
    for (const auto& bed : campaign.beds)
        check_stretch_named(campaign, bed.stretch, bed.where, "[[bed]]", reading);
    if (campaign.adjust &&
        std::none_of(campaign.baths.begin(), campaign.baths.end(),
                     [](const Bath& bath) { return bath.use == BathUse::adjust; }))
        reading.problem(campaign.adjust->where,
                        "[adjust] has no bath to go by; give a [[bath]] with use = \"adjust\"");
    if (!campaign.marks.empty() && !campaign.placement)
        reading.problem(campaign.marks.front().where,
                        "[[mark]] stands without [placement]; say crs there");
}

} // namespace rillstrand::campaign

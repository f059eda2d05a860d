// SPDX-License-Identifier: Apache-2.0
#include "cautions.hpp"

namespace rillstrand::app {

std::vector<std::string> cautions_for(const campaign::Campaign& campaign) {
    std::vector<std::string> cautions{
        "Local rules, owners, emergency services and licensed professionals decide; nothing here "
        "replaces them.",
        "Laser: treat every open fibre end as live. Invisible infrared can injure the eye; never "
        "look "
        "into a connector or view one through a magnifier; switch off before disconnecting, cap "
        "the "
        "ends, read the class on the label (IEC 60825-1 and -2), handle fibre shards with glasses "
        "and a sharps tape."};
    if (!campaign.streams.empty() || !campaign.beds.empty()) {
        cautions.emplace_back(
            "Wading: depth, speed, cold and footing decide; stay out where in doubt. Wear a "
            "flotation "
            "vest, never tie a cable to the body, never work alone, watch for releases upstream.");
        cautions.emplace_back(
            "Dams, levees, tailings and slopes: a cold or warm strip is a clue, not a finding. Any "
            "decision about seepage belongs to a licensed engineer and the owner's emergency plan; "
            "sudden change goes to them at once. Nothing here calls an embankment safe.");
        cautions.emplace_back(
            "Water supply and health: temperature says nothing about contamination.");
    }
    if (!campaign.columns.empty())
        cautions.emplace_back("Boats and deep water: a snagged cable can capsize or pull; carry a "
                              "cutter, wear a flotation vest.");
    cautions.emplace_back("Ice: no computed map says that ice will hold. Groundwater seeps thin "
                          "the ice; test every few "
                          "metres, go in pairs with picks and a rope, follow the local guidance.");
    if (!campaign.snows.empty())
        cautions.emplace_back(
            "Snow and avalanche terrain: read the local bulletin; training, beacon, shovel, probe "
            "and "
            "a partner. Temperatures at the base of the snow are no forecast of its stability.");
    cautions.emplace_back(
        "Cable in the open is a trip and entanglement hazard and, on ridges, attracts "
        "lightning: mark it, ask owners and fisheries managers, avoid spawning beds.");
    return cautions;
}

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#include "quality_events.hpp"

#include "base/text.hpp"

#include <cmath>
#include <map>
#include <utility>

namespace rillstrand::app {

namespace {

const char* words_of(const std::string& kind) {
    static const std::map<std::string, const char*> words{
        {"stuck", "one value throughout"},
        {"exposed", "the day swing of cable out of the water or in the sun"},
        {"splice", "a step that does not follow the water, as splices and bends make,"},
        {"clock", "a step of the clock that is no whole number of intervals"},
        {"dropout", "traces that miss over half of the channels"},
        {"jump", "a jump of the whole trace"},
        {"trace", "a trace that is off as a whole"},
        {"spike", "a sample far off its neighbours"}};
    const auto found = words.find(kind);
    return found == words.end() ? nullptr : found->second;
}

std::string where(const quality::Event& event) {
    std::string at;
    if (!std::isnan(event.from_m))
        at += " at " + text::fixed(event.from_m, 1) + " m";
    if (!std::isnan(event.from_s))
        at += " at " + text::iso_time(event.from_s);
    return at;
}

} // namespace

void events_stage(Session& session, const Context& context) {
    session.events = quality::find_events({*session.source, *session.scan, session.names.setting,
                                           session.names.stretch, session.spatial_response_m},
                                          context.progress);
    std::map<std::string, int> count;
    for (const auto& event : session.events)
        ++count[event.kind];
    for (const auto& event : session.events) {
        const char* words = words_of(event.kind);
        const int more = std::exchange(count[event.kind], 0) - 1;
        if (words == nullptr || more < 0)
            continue; // said by the channels' flags, or already
        session.warnings.push_back(
            {"record-" + event.kind,
             std::string{"the record has "} + words + where(event) +
                 (more > 0 ? ", and " + std::to_string(more) + " more" : "") +
                 "; quality.events in the findings has the evidence"});
    }
}

Table events_table(const Session& session) {
    Table table{"events", "Faults of the record"};
    std::vector<std::string> kind, evidence, done;
    std::vector<double> from_m, to_m, from, to, size;
    for (const auto& event : session.events) {
        kind.push_back(event.kind);
        from_m.push_back(event.from_m);
        to_m.push_back(event.to_m);
        from.push_back(event.from_s);
        to.push_back(event.to_s);
        size.push_back(event.size_K);
        evidence.push_back(event.evidence);
        done.push_back(event.done);
    }
    table.add_text("kind", "what it is", kind);
    table.add_real("fibre_from_m", "where it begins; missing: the whole trace", "m", from_m, 3);
    table.add_real("fibre_to_m", "where it ends", "m", to_m, 3);
    table.add_time("from", "when it begins; missing: the whole record", from);
    table.add_time("to", "when it ends", to);
    table.add_real("size_c", "its size", "K", size, 3);
    table.add_text("evidence", "what it is told from", evidence);
    table.add_text("done", "what was done about it", done);
    return table;
}

Json events_json(const Session& session) {
    return session.events.empty() ? Json::array() : rows_json(events_table(session));
}

} // namespace rillstrand::app

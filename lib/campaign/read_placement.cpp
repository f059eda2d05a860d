// SPDX-License-Identifier: Apache-2.0
#include "campaign/read_parts.hpp"

#include "base/text.hpp"

namespace rillstrand::campaign {

namespace {

void read_control(TableReader& in, Placement& placement) {
    PlacementControl out;
    out.where = in.where();
    in.require("crs", "the coordinate system of the control points' world coordinates");
    in.require("points", "the file of control points");
    in.text("crs", out.crs);
    in.path("points", out.points);
    placement.control = out;
}

} // namespace

void read_placement(TableReader& root, Campaign& campaign) {
    root.table("placement", [&campaign](TableReader& in) {
        Placement out;
        out.where = in.where();
        in.require("crs", "the coordinate system of the tie points, e.g. \"EPSG:25832\"");
        in.text("crs", out.crs);
        if (in.has("tie_points") || campaign.marks.empty())
            in.require("tie_points", "the file of surveyed tie points");
        in.path("tie_points", out.tie_points);
        in.path("cable_marks", out.cable_marks);
        in.path("route", out.route);
        in.path("river", out.river);
        in.path("elevation", out.elevation);
        in.real("turnaround_m", out.turnaround_m);
        in.text("output_crs", out.output_crs);
        if (!out.output_crs && out.crs != "local")
            in.used_default("output_crs", out.crs);
        in.tables("raster", [&out](TableReader& raster) {
            NamedRaster value;
            value.where = raster.where();
            raster.require("name", "a name for the attribute");
            raster.require("file", "the raster's file");
            raster.text("name", value.name);
            raster.path("file", value.file);
            out.raster.push_back(value);
        });
        in.real("max_slack", out.max_slack, {1.0, 1000.0, true});
        in.used_default("max_slack", text::number(out.max_slack));
        in.table("control", [&out](TableReader& inner) { read_control(inner, out); });
        if (out.crs == "local" && !out.control && !in.has("control"))
            in.problem("crs", "is \"local\", which needs [placement.control] with control points");
        if (out.crs != "local" && out.control)
            in.problem("control", "stands beside crs = \"" + out.crs +
                                      "\"; control points go with crs = \"local\"");
        campaign.placement = out;
    });
}

void read_marks(TableReader& root, Campaign& campaign) {
    root.tables("mark", [&campaign](TableReader& in) {
        Mark out;
        out.where = in.where();
        for (const char* key : {"kind", "begin", "end", "near_m", "within_m", "x", "y"})
            in.require(key, "it");
        in.text("label", out.label);
        in.word("kind", out.kind, {{"cold", MarkKind::cold}, {"warm", MarkKind::warm}});
        const bool begin = in.time("begin", out.begin_s);
        const bool end = in.time("end", out.end_s);
        if (begin && end && !(out.begin_s < out.end_s))
            in.problem("end", "is not after begin; correct one of the two");
        in.real("near_m", out.near_m);
        in.real("within_m", out.within_m, positive);
        in.real("x", out.x);
        in.real("y", out.y);
        in.real("z", out.z);
        in.real("sd_m", out.sd_m, not_negative);
        campaign.marks.push_back(out);
    });
}

} // namespace rillstrand::campaign

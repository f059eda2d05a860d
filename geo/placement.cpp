// SPDX-License-Identifier: Apache-2.0
#include "placement.hpp"

#include "adjustment.hpp"
#include "base/text.hpp"
#include "control.hpp"
#include "crs.hpp"
#include "fibre_map.hpp"
#include "heights.hpp"
#include "mark.hpp"
#include "raster_sample.hpp"
#include "record/winding.hpp"
#include "route.hpp"
#include "survey.hpp"
#include "tie_checks.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <optional>

namespace rillstrand::geo {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
const char* const wgs84 = "EPSG:4326";

/// The same work for every channel, on all processors where they are many.
template <class Work> void for_channels(Eigen::Index n, const Work& work) {
    constexpr Eigen::Index share = 50000;
    tbb::parallel_for(tbb::blocked_range<Eigen::Index>{0, n, share},
                      [&](const tbb::blocked_range<Eigen::Index>& part) {
                          for (Eigen::Index j = part.begin(); j < part.end(); ++j)
                              work(j);
                      });
}

class Placer {
public:
    Placer(const campaign::Campaign& campaign, const Eigen::ArrayXd& distance_m,
           const record::Source* source)
        : m_campaign{campaign}, m_settings{*campaign.placement},
          m_distance_m{distance_m}, m_source{source}, m_map{campaign} {}

    Placement run() {
        gather_ties();
        find_systems();
        make_plane();
        make_ties();
        const Adjustment adjustment{m_ties, m_route};
        append(adjustment.warnings());
        place_channels(adjustment);
        refuse_pieces();
        place_verticals();
        to_output();
        sample();
        put_on_river();
        report_ties();
        draw_cable();
        finish();
        return std::move(m_out);
    }

private:
    void append(const Warnings& warnings) {
        m_out.warnings.insert(m_out.warnings.end(), warnings.begin(), warnings.end());
    }

    void gather_ties() {
        Survey survey = read_survey(m_campaign);
        m_points = std::move(survey.points);
        append(survey.warnings);
        Problems problems;
        for (const auto& mark : m_campaign.marks) {
            try {
                if (m_source == nullptr)
                    continue;
                const FoundMark found = find_mark(*m_source, mark, m_campaign.place(mark.where));
                TiePoint tie;
                tie.label = mark.label.empty() ? "mark" : mark.label;
                tie.place = m_campaign.place(mark.where);
                tie.fibre_m = found.fibre_m;
                tie.fibre_sd_m = found.sd_m;
                tie.x = mark.x;
                tie.y = mark.y;
                tie.z = mark.z.value_or(nan);
                tie.sd_m = std::max(0.01, mark.sd_m.value_or(default_tie_sd_m));
                m_points.push_back(tie);
            } catch (const DataError& error) {
                problems.add(error);
            }
        }
        problems.throw_if_any();
        std::stable_sort(
            m_points.begin(), m_points.end(),
            [](const TiePoint& a, const TiePoint& b) { return a.fibre_m < b.fibre_m; });
        if (m_points.size() < 2)
            throw DataError{m_campaign.place(m_settings.where) + ": placement has " +
                            std::to_string(m_points.size()) +
                            " tie points; at least two are needed to place a cable"};
    }

    void find_systems() {
        std::string crs = m_settings.crs;
        m_out.local_scale_mm_km = nan;
        if (crs == "local") {
            const ControlFit fit = fit_control(m_settings.control->points);
            append(fit.warnings);
            const PointsXY world = fit.similarity.apply(coordinates_of(m_points));
            for (std::size_t i = 0; i < m_points.size(); ++i) {
                m_points[i].x = world(static_cast<Eigen::Index>(i), 0);
                m_points[i].y = world(static_cast<Eigen::Index>(i), 1);
            }
            m_local = fit.similarity;
            m_out.local_scale_mm_km = (fit.similarity.scale - 1.0) * 1e6;
            crs = m_settings.control->crs;
        }
        m_crs.emplace(crs, m_settings.crs == "local" ? "placement.control.crs" : "placement.crs");
        m_out.crs = crs;
        m_out.crs_name = m_crs->name();
        m_out.output_crs = m_settings.output_crs.value_or(crs);
        m_output.emplace(m_out.output_crs, "placement.output_crs");
        m_out.output_crs_name = m_output->name();
        m_out.output_wkt = m_output->wkt();
        m_to_wgs84.emplace(*m_crs, Crs{wgs84, "WGS 84"});
    }

    void make_plane() {
        m_lonlat = checked_lonlat(m_points, *m_crs, *m_to_wgs84);
        m_out.operation = m_to_wgs84->operation();
        m_out.operation_accuracy_m = m_to_wgs84->accuracy_m();
        m_out.first_lon = m_lonlat(0, 0);
        m_out.first_lat = m_lonlat(0, 1);
        double height_m = 0.0, heights = 0.0;
        for (const auto& tie : m_points)
            if (std::isfinite(tie.z)) {
                height_m += tie.z;
                heights += 1.0;
            }
        if (heights == 0.0 && m_settings.elevation) {
            const RasterSamples z =
                sample_raster(*m_settings.elevation, m_lonlat, false, "placement.elevation");
            for (const double value : z.value)
                if (std::isfinite(value)) {
                    height_m += value;
                    heights += 1.0;
                }
        }
        m_plane.emplace(m_lonlat, heights > 0.0 ? height_m / heights : nan);
        m_plane_xy = m_plane->from_lonlat(m_lonlat);
    }

    void make_ties() {
        for (std::size_t i = 0; i < m_points.size(); ++i) {
            const TiePoint& p = m_points[i];
            Tie tie;
            tie.label = p.label;
            tie.place = p.place;
            tie.path_m = m_map.path_m(p.fibre_m);
            tie.xy = m_plane_xy.row(static_cast<Eigen::Index>(i)).matrix().transpose();
            tie.sd_m = p.sd_m;
            tie.path_sd_m = p.fibre_sd_m;
            m_ties.push_back(tie);
        }
        m_order.resize(m_ties.size());
        std::iota(m_order.begin(), m_order.end(), std::size_t{0});
        std::stable_sort(m_order.begin(), m_order.end(), [this](std::size_t a, std::size_t b) {
            return m_ties[a].path_m < m_ties[b].path_m;
        });
        std::vector<Tie> sorted;
        for (const std::size_t i : m_order)
            sorted.push_back(m_ties[i]);
        m_ties = std::move(sorted);
        std::vector<double> ground_m, cable_m;
        for (std::size_t i = 1; i < m_ties.size(); ++i) {
            ground_m.push_back((m_ties[i].xy - m_ties[i - 1].xy).norm());
            cable_m.push_back(m_ties[i].path_m - m_ties[i - 1].path_m);
        }
        refuse_wrong_unit(ground_m, cable_m, m_settings.tie_points.string());
        if (!m_settings.route)
            return;
        const std::string route_crs = m_settings.crs == "local" ? m_out.crs : m_settings.crs;
        const LineFromFile line = read_line(*m_settings.route, route_crs, "placement.route");
        append(line.warnings);
        const PointsXY xy = m_plane->from_lonlat(line.lonlat);
        const Polyline route{xy, line.z};
        if (route.vertices().rows() < 2)
            throw DataError{m_settings.route->string() + ": the line has no length"};
        m_route = match_to_route(route, m_ties, m_settings.max_slack);
        m_out.has_route = true;
    }

    void place_channels(const Adjustment& adjustment) {
        const Eigen::Index n = m_distance_m.size();
        Eigen::ArrayXd path_m(n);
        for_channels(n, [&](Eigen::Index j) { path_m(j) = m_map.path_m(m_distance_m(j)); });
        std::vector<Eigen::Index> order(static_cast<std::size_t>(n));
        std::iota(order.begin(), order.end(), Eigen::Index{0});
        if (!std::is_sorted(path_m.begin(), path_m.end()))
            std::stable_sort(order.begin(), order.end(),
                             [&](Eigen::Index a, Eigen::Index b) { return path_m(a) < path_m(b); });
        Eigen::ArrayXd sorted(n);
        for (Eigen::Index k = 0; k < n; ++k)
            sorted(k) = path_m(order[static_cast<std::size_t>(k)]);
        const PlacedPath path = adjustment.place(sorted);
        auto& c = m_out.channels;
        m_xy.resize(n, 2);
        for (Eigen::ArrayXd* a : {&c.along_sd_m, &c.across_sd_m, &c.ground_m, &c.station_m,
                                  &c.offset_m, &c.z, &c.x, &c.y, &c.lon, &c.lat, &c.position_sd_m})
            *a = Eigen::ArrayXd::Constant(n, nan);
        c.leg.resize(static_cast<std::size_t>(n));
        c.reason.assign(static_cast<std::size_t>(n), NoPosition::placed);
        for_channels(n, [&](Eigen::Index k) {
            const Eigen::Index j = order[static_cast<std::size_t>(k)];
            m_xy.row(j) = path.xy.row(k);
            c.along_sd_m(j) = std::sqrt(path.along_variance(k));
            c.across_sd_m(j) = std::sqrt(path.across_variance(k));
            c.ground_m(j) = path.ground_m(k);
            c.leg[static_cast<std::size_t>(j)] = m_map.leg(m_distance_m(j));
        });
        m_path_m = path_m;
        refuse_beyond_survey();
        interpolate_heights();
    }

    /// Beyond the outermost tie points the cable is followed along the route to its ends; without a
    /// route nothing says where it runs, and half the usual distance between tie points is allowed.
    void refuse_beyond_survey() {
        double first_m = 1e300, last_m = -1e300;
        std::size_t used = 0;
        for (const auto& tie : m_ties)
            if (tie.used) {
                first_m = std::min(first_m, tie.path_m);
                last_m = std::max(last_m, tie.path_m);
                ++used;
            }
        const double margin_m =
            0.5 * (last_m - first_m) / static_cast<double>(std::max<std::size_t>(1, used - 1));
        for (Eigen::Index j = 0; j < m_path_m.size(); ++j) {
            const bool beyond = m_path_m(j) < first_m || m_path_m(j) > last_m;
            if (!beyond)
                continue;
            const double ground_m = m_out.channels.ground_m(j);
            const bool off_route =
                m_route && (ground_m < -0.5 || ground_m > m_route->length_m() + 0.5);
            const bool too_far =
                !m_route && (m_path_m(j) < first_m - margin_m || m_path_m(j) > last_m + margin_m);
            if (off_route || too_far)
                drop(j, NoPosition::beyond_survey);
        }
    }

    void drop(Eigen::Index j, NoPosition reason) {
        m_xy.row(j).setConstant(nan);
        m_out.channels.along_sd_m(j) = m_out.channels.across_sd_m(j) = nan;
        m_out.channels.ground_m(j) = nan;
        m_out.channels.reason[static_cast<std::size_t>(j)] = reason;
    }

    double ground_between(const Tie& a, const Tie& b) const {
        return m_route ? b.measure_m - a.measure_m : (b.xy - a.xy).norm();
    }

    /// Pieces with more slack than is allowed, or under 1 by more than the sd of their ends allow.
    void refuse_pieces() {
        std::vector<std::size_t> used;
        for (std::size_t i = 0; i < m_ties.size(); ++i)
            if (m_ties[i].used)
                used.push_back(i);
        std::size_t refused = 0;
        double cable_sum = 0.0, ground_sum = 0.0;
        for (std::size_t k = 1; k < used.size(); ++k) {
            const Tie& a = m_ties[used[k - 1]];
            const Tie& b = m_ties[used[k]];
            const double cable_m = b.path_m - a.path_m, ground_m = ground_between(a, b);
            const double sd_m = std::sqrt(a.sd_m * a.sd_m + b.sd_m * b.sd_m +
                                          a.path_sd_m * a.path_sd_m + b.path_sd_m * b.path_sd_m);
            if (cable_m <= 0.0)
                continue; // two surveys of one coil, or of both legs
            std::string why;
            if (ground_m - cable_m > 3.0 * sd_m)
                why = "only " + text::fixed(cable_m, 1) + " m of fibre for " +
                      text::fixed(ground_m, 1) + " m of ground: one of the two is a blunder";
            else if (cable_m - m_settings.max_slack * ground_m > 3.0 * sd_m * m_settings.max_slack)
                why = text::fixed(cable_m / std::max(ground_m, 1e-9), 3) +
                      " fibre metres per ground metre, over placement.max_slack = " +
                      text::number(m_settings.max_slack) +
                      ": a coil that is not declared as a stretch, or a blunder";
            if (why.empty()) {
                cable_sum += cable_m;
                ground_sum += ground_m;
                continue;
            }
            ++refused;
            m_out.warnings.push_back({"piece-refused", a.place + " and " + b.place + ": between '" +
                                                           a.label + "' and '" + b.label +
                                                           "' there is " + why +
                                                           "; its channels have no position"});
            for (Eigen::Index j = 0; j < m_path_m.size(); ++j)
                if (m_path_m(j) > a.path_m && m_path_m(j) < b.path_m)
                    drop(j, NoPosition::slack_refused);
        }
        m_out.slack_mean = ground_sum > 0.0 ? cable_sum / ground_sum : nan;
        if (refused > 0 && refused + 1 == used.size()) {
            Problems problems;
            for (const auto& warning : m_out.warnings)
                if (warning.code == "piece-refused")
                    problems.add(warning.text);
            problems.throw_if_any();
        }
    }

    void interpolate_heights() {
        std::vector<std::pair<double, double>> known;
        for (std::size_t k = 0; k < m_ties.size(); ++k) {
            const double z = m_points[m_order[k]].z;
            if (std::isfinite(z) && m_ties[k].used)
                known.emplace_back(m_ties[k].path_m, z);
        }
        for_channels(m_path_m.size(), [&](Eigen::Index j) {
            double& z = m_out.channels.z(j);
            if (m_route && m_route->along_slope() && std::isfinite(m_out.channels.ground_m(j)))
                z = m_route->height_at(m_out.channels.ground_m(j));
            else
                z = height_between(known, m_path_m(j));
        });
        m_out.lengths = m_route && m_route->along_slope() ? "along the slope" : "horizontal";
    }

    void place_vertical(const std::string& stretch_name, double datum_m,
                        campaign::Direction direction,
                        const std::optional<campaign::Winding>& winding,
                        const std::optional<std::array<double, 2>>& position,
                        const std::optional<double>& elevation_m) {
        const auto* stretch = m_campaign.find_stretch(stretch_name);
        if (stretch == nullptr)
            return;
        const record::Axes axes{{}, 0.0, m_distance_m};
        const auto range = record::places_between(axes, stretch->from_m, stretch->to_m);
        PointsXY at(1, 2);
        if (position) {
            at << (*position)[0], (*position)[1];
            if (m_local)
                at = m_local->apply(at);
            at = m_plane->from_lonlat(m_to_wgs84->forward(at));
        }
        for (Eigen::Index j = range.first; j < range.first + range.count; ++j) {
            auto& c = m_out.channels;
            if (position) {
                m_xy.row(j) = at.row(0);
                c.along_sd_m(j) = c.across_sd_m(j) = winding ? 0.5 * winding->diameter_m : 0.0;
                c.reason[static_cast<std::size_t>(j)] = NoPosition::placed;
            }
            const double datum_z = elevation_m.value_or(c.z(j));
            c.z(j) =
                datum_z - record::depth_below_datum_m(m_distance_m(j), datum_m, direction, winding);
        }
    }

    void place_verticals() {
        for (const auto& c : m_campaign.columns)
            place_vertical(c.stretch, c.datum_fibre_m, c.direction, c.winding, c.position,
                           c.datum_elevation_m);
        for (const auto& b : m_campaign.beds)
            place_vertical(b.stretch, b.datum_fibre_m, b.direction, b.winding, b.position,
                           b.datum_elevation_m);
    }

    void to_output() {
        auto& c = m_out.channels;
        m_channel_lonlat = m_plane->to_lonlat(m_xy);
        c.lon = m_channel_lonlat.col(0);
        c.lat = m_channel_lonlat.col(1);
        m_to_output.emplace(*m_output, Crs{wgs84, "WGS 84"});
        const PointsXY xy = m_to_output->inverse(m_channel_lonlat);
        c.x = xy.col(0);
        c.y = xy.col(1);
        c.position_sd_m = (c.along_sd_m.square() + c.across_sd_m.square()).sqrt();
    }

    void sample() {
        auto& c = m_out.channels;
        const auto count = [this](Eigen::Index outside, const std::string& name) {
            const Eigen::Index really =
                outside; // channels without position are not counted by the sampler
            if (really > 0)
                m_out.warnings.push_back({"raster-outside", std::to_string(really) +
                                                                " channels lie outside raster '" +
                                                                name + "' or on nodata"});
        };
        if (m_settings.elevation) {
            const RasterSamples z =
                sample_raster(*m_settings.elevation, m_channel_lonlat, true, "placement.elevation");
            c.z = c.z.isFinite().select(c.z, z.value);
            c.slope_deg = z.slope_deg;
            c.aspect_deg = z.aspect_deg;
            count(z.outside, "elevation");
        }
        for (const auto& raster : m_settings.raster) {
            const RasterSamples values =
                sample_raster(raster.file, m_channel_lonlat, false, "placement.raster");
            c.rasters.push_back({raster.name, values.value});
            count(values.outside, raster.name);
        }
    }

    void put_on_river() {
        if (!m_settings.river)
            return;
        const LineFromFile line = read_line(*m_settings.river, m_out.crs, "placement.river");
        append(line.warnings);
        const Polyline river{m_plane->from_lonlat(line.lonlat), {}};
        auto& c = m_out.channels;
        double with = 0.0;
        double last = nan;
        for_channels(m_xy.rows(), [&](Eigen::Index j) {
            if (!std::isfinite(m_xy(j, 0)))
                return;
            const Nearest place = river.nearest(m_xy(j, 0), m_xy(j, 1));
            c.station_m(j) = place.measure_m;
            c.offset_m(j) = place.offset_m;
        });
        for (const double station_m : c.station_m) {
            if (std::isnan(station_m))
                continue;
            if (std::isfinite(last))
                with += station_m > last ? 1.0 : -1.0;
            last = station_m;
        }
        for (const auto& stream : m_campaign.streams) {
            const bool rising = with > 0.0;
            if (rising != (stream.flow == campaign::Flow::increasing))
                m_out.warnings.push_back(
                    {"river-direction", "placement.river runs against the flow that stream '" +
                                            stream.stretch +
                                            "' states; station_m falls downstream"});
        }
    }

    void report_ties() {
        const PointsXY out_xy = m_to_output->inverse(m_lonlat);
        std::vector<std::size_t> used;
        double square = 0.0;
        for (std::size_t k = 0; k < m_ties.size(); ++k)
            if (m_ties[k].used) {
                used.push_back(k);
                square += m_ties[k].residual_m * m_ties[k].residual_m;
            }
        m_out.residual_rms_m = std::sqrt(square / static_cast<double>(used.size()));
        for (std::size_t k = 0; k < m_ties.size(); ++k) {
            const Tie& tie = m_ties[k];
            const std::size_t i = m_order[k];
            const auto r = static_cast<Eigen::Index>(i);
            PlacedTie placed;
            placed.label = tie.label;
            placed.place = tie.place;
            placed.fibre_m = m_points[i].fibre_m;
            placed.x = out_xy(r, 0);
            placed.y = out_xy(r, 1);
            placed.z = m_points[i].z;
            placed.lon = m_lonlat(r, 0);
            placed.lat = m_lonlat(r, 1);
            placed.sd_m = tie.sd_m;
            placed.residual_m = tie.residual_m;
            placed.offset_m = m_route ? tie.offset_m : nan;
            placed.used = tie.used;
            placed.reason = tie.reason;
            placed.slack = nan;
            const auto next = std::upper_bound(used.begin(), used.end(), k);
            if (tie.used && next != used.end()) {
                const double ground_m = ground_between(tie, m_ties[*next]);
                if (ground_m > 0.0)
                    placed.slack = (m_ties[*next].path_m - tie.path_m) / ground_m;
            }
            m_out.ties.push_back(placed);
        }
        std::stable_sort(
            m_out.ties.begin(), m_out.ties.end(),
            [](const PlacedTie& a, const PlacedTie& b) { return a.fibre_m < b.fibre_m; });
    }

    void draw_cable() {
        const auto& c = m_out.channels;
        const record::Axes axes{{}, 0.0, m_distance_m};
        const auto line = [&](const std::string& name, double from_m, double to_m) {
            const auto range = record::places_between(axes, from_m, to_m);
            CableLine cable;
            cable.stretch = name;
            cable.from_m = from_m;
            cable.to_m = to_m;
            cable.vertices.reserve(static_cast<std::size_t>(range.count));
            double first = nan, last = nan;
            for (Eigen::Index j = range.first; j < range.first + range.count; ++j) {
                if (!std::isfinite(c.x(j)))
                    continue;
                cable.vertices.emplace_back(c.x(j), c.y(j), c.z(j));
                if (std::isnan(first))
                    first = c.ground_m(j);
                last = c.ground_m(j);
            }
            const double ground_m = std::abs(last - first);
            const double path_m =
                range.count > 1
                    ? std::abs(m_path_m(range.first + range.count - 1) - m_path_m(range.first))
                    : 0.0;
            cable.slack = ground_m > 0.0 ? path_m / ground_m : nan;
            if (cable.vertices.size() > 1)
                m_out.cable.push_back(cable);
        };
        for (const auto& s : m_campaign.stretches)
            line(s.name, s.from_m, s.to_m);
        if (m_campaign.stretches.empty() && m_distance_m.size() > 1)
            line("cable", m_distance_m(0), m_distance_m(m_distance_m.size() - 1));
    }

    void finish() {
        Eigen::Index beyond = 0, slack = 0;
        for (const NoPosition reason : m_out.channels.reason) {
            if (reason == NoPosition::beyond_survey)
                ++beyond;
            if (reason == NoPosition::slack_refused)
                ++slack;
        }
        m_out.unplaced = beyond + slack;
        if (beyond > 0)
            m_out.warnings.push_back({"channels-beyond-survey",
                                      std::to_string(beyond) +
                                          " channels lie beyond the surveyed cable and have no "
                                          "position; add tie points to place them"});
        if (m_out.unplaced == m_distance_m.size())
            throw DataError{
                m_settings.tie_points.string() +
                ": no channel of the record lies between the tie points; compare fibre_m "
                "with the record's distances"};
    }

    const campaign::Campaign& m_campaign;
    const campaign::Placement& m_settings;
    const Eigen::ArrayXd& m_distance_m;
    const record::Source* m_source;
    FibreMap m_map;
    std::vector<TiePoint> m_points;
    std::optional<Similarity> m_local;
    std::optional<Crs> m_crs, m_output;
    std::optional<Transformation> m_to_wgs84, m_to_output;
    std::optional<GroundPlane> m_plane;
    PointsXY m_lonlat, m_plane_xy, m_xy, m_channel_lonlat;
    std::vector<Tie> m_ties;          ///< by path
    std::vector<std::size_t> m_order; ///< m_ties[k] is m_points[m_order[k]]
    std::optional<Polyline> m_route;
    Eigen::ArrayXd m_path_m;
    Placement m_out;
};

} // namespace

Placement place(const campaign::Campaign& campaign, const Eigen::ArrayXd& distance_m,
                const record::Source* source) {
    return Placer{campaign, distance_m, source}.run();
}

std::vector<std::string> check_placement(const campaign::Campaign& campaign) {
    if (!campaign.placement)
        return {};
    const auto& settings = *campaign.placement;
    Problems problems;
    const auto tried = [&problems](const auto& work) {
        try {
            work();
        } catch (const DataError& error) {
            problems.add(error);
        }
    };
    Survey survey;
    tried([&] { survey = read_survey(campaign); });
    tried([&] {
        if (settings.crs == "local") {
            (void)fit_control(settings.control->points);
            (void)Crs{settings.control->crs, "placement.control.crs"};
            return;
        }
        const Crs crs{settings.crs, "placement.crs"};
        if (!survey.points.empty())
            (void)checked_lonlat(survey.points, crs, Transformation{crs, Crs{wgs84, "WGS 84"}});
    });
    if (settings.output_crs)
        tried([&] { (void)Crs{*settings.output_crs, "placement.output_crs"}; });
    if (settings.route)
        tried([&] { (void)read_line(*settings.route, wgs84, "placement.route"); });
    if (settings.river)
        tried([&] { (void)read_line(*settings.river, wgs84, "placement.river"); });
    return problems.list();
}

} // namespace rillstrand::geo

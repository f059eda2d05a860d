// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"

#include <Eigen/Core>

#include <optional>
#include <string>
#include <vector>

/// Inflows of a stream, from the temperatures of a cable on its bed.
namespace rillstrand::stream {

/// A value at times: a logger in a spring, a gauge, a tributary.
struct Series {
    Eigen::ArrayXd time_s; ///< UTC seconds since 1970-01-01, increasing
    Eigen::ArrayXd value;  ///< in the unit of its use (degC, m3/s); NaN where missing
};

/// Channels that take no part, and why (a bath inside the reach, a coil, a dead piece).
struct Exclusion {
    double from_m = 0.0; ///< fibre distance
    double to_m = 0.0;
    std::string reason;
};

/// Surface water known to join.
struct KnownWater {
    std::string label;
    double fibre_m = 0.0;
    std::optional<Series> temperature_degC; ///< absent: no share can be told
};

/// What is known of one reach.
struct StreamInput {
    Eigen::ArrayXd time_s;            ///< UTC, middle of each bin, increasing; gaps are legal
    double interval_s = 0.0;          ///< length of a bin; 600 to 3600 s serve well
    Eigen::ArrayXd fibre_m;           ///< fibre distance of each channel, increasing
    Eigen::ArrayXXd temperature_degC; ///< mean of each bin, row = time, column = channel; NaN: none
    double spatial_response_m =
        1.0; ///< width over which a sharp step is seen to go from 10 to 90 %
    std::vector<Exclusion> excluded;
    std::optional<double> longitude_deg, latitude_deg; ///< for the sun; else told from the record
    campaign::Stream config;                           ///< only numbers are read, no file
    std::optional<Series>
        inflow_temperature_degC;         ///< of the groundwater, beside or for the constant
    std::optional<Series> discharge_m3s; ///< at the end that config.discharge_at names
    std::vector<KnownWater> known;
};

enum class Kind { step, spot, diffuse };
std::string to_string(Kind kind);

/// Water that comes in. Every sd is one standard deviation; NaN: not known or not resolvable.
struct Inflow {
    Kind kind = Kind::step;
    bool known = false;   ///< declared as surface water
    std::string label;    ///< of the declared water, else empty
    double fibre_m = 0.0; ///< where it comes in (a diffuse gain: its middle)
    double fibre_sd_m = 0.0;
    double fibre_from_m = 0.0, fibre_to_m = 0.0; ///< about where: 95 %, or the gaining piece
    double fraction = 0.0; ///< of the discharge just below; spots: NaN, they do not change it
    double fraction_sd = 0.0;
    double temperature_c = 0.0;
    double temperature_sd_c = 0.0;
    double discharge_m3s = 0.0;
    double discharge_sd_m3s = 0.0;
    double contrast_c = 0.0;      ///< inflow minus stream, the mean of its size over the record
    double score = 0.0;           ///< standard deviations from nothing, |z|
    double mixing_length_m = 0.0; ///< e-folding length of incomplete mixing below; 0: none seen
    double anomaly_c = 0.0;       ///< mean step (spots: mean deviation) at the cable
    double priority = 0.0;        ///< 0..1, what is most worth a visit
    std::vector<std::string> evidence; ///< sentences
};

/// Something along the cable that is no water coming in.
struct Artefact {
    std::string kind; ///< `step loss`, `sun or shade`, `dry cable`, `buried cable`, `local`,
                      ///< `unexplained step`
    double from_m = 0.0, to_m = 0.0;
    double size_c = 0.0;
    std::string text;
};

/// One channel of the reach. Same order as StreamInput::fibre_m.
struct StreamChannels {
    Eigen::ArrayXd fibre_m;
    Eigen::ArrayXd background_c; ///< mean of the fitted background (inflows in, artefacts out)
    Eigen::ArrayXd anomaly_c;    ///< mean temperature minus background
    Eigen::ArrayXd
        detection_limit_fraction; ///< smallest share found with 95 % power here; NaN: none
    Eigen::ArrayXd sevendadm_c; ///< greatest seven-day mean of daily maxima; NaN under 7 full days
    Eigen::ArrayXd discharge_m3s, discharge_sd_m3s; ///< along the reach; NaN where unknown
    std::vector<Eigen::ArrayXd> hours_above;        ///< one array a threshold of config.regime
    Eigen::ArrayXd noise_c;                         ///< white noise of a bin
};

/// Water colder than what surrounds it.
struct Refuge {
    double from_m = 0.0, to_m = 0.0;
    double colder_by_c = 0.0; ///< mean while it lasts, against the reach's median of that time
    double persistence = 0.0; ///< share of the hours of daily maxima (11 to 19 h solar) it is there
};

/// Discharge between two gaugings against what temperature found between them.
struct Closure {
    double from_m = 0.0, to_m = 0.0;
    double gauged_gain_m3s = 0.0, gauged_gain_sd_m3s = 0.0;
    double found_gain_m3s = 0.0, found_gain_sd_m3s = 0.0;
    std::string text;
};

struct StreamFindings {
    std::string stretch;
    std::vector<Inflow> inflows; ///< in the order of the water
    std::vector<Artefact> artefacts;
    StreamChannels channels;
    std::vector<Refuge> refuges;
    std::vector<Closure> closures;
    double inflow_temperature_c = 0.0; ///< shared by the reach; NaN where not resolvable
    double inflow_temperature_sd_c = 0.0;
    bool inflow_temperature_given = false;
    double family_level = 0.05; ///< chance that a reach without inflow reports any
    double threshold_z = 0.0;   ///< what a step must reach for that
    double noise_c = 0.0;       ///< median white noise of a bin
    double drift_c = 0.0;       ///< slow common wandering, rms, where it can be told
    double detection_limit_median = 0.0;
    std::vector<std::string> evidence; ///< of the reach: tests made and how they ended
    std::vector<std::string> cautions;
    std::string method; ///< one paragraph, with citations, for a paper
};

/// Finds what comes in along a reach.
///
/// Model: temperature just below = (1 - f) upstream + f inflow, for all times at once; weighted
/// means over time of that law are the law again, so the record is brought to profiles along the
/// fibre whose weights are chosen to let the contrast through and the heating of sun, shade and
/// air out. In a profile the background is an integrated random walk along the fibre
/// (level and slope free everywhere, its roughness estimated from the reach), inflows are steps
/// seen through the spatial response with a plume that mixes in, spots are steps that return.
///
/// @return all findings; a reach that cannot carry them gives cautions and NaN, no number
/// @throws DataError if there are fewer than 8 usable channels or fewer than 3 times, or if sizes
///         disagree
StreamFindings interpret(const StreamInput& input);

} // namespace rillstrand::stream

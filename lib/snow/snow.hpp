// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "campaign/campaign.hpp"
#include "snow/days.hpp"

#include <Eigen/Core>

#include <optional>
#include <string>
#include <vector>

/// Bare or under snow: a stretch of cable over or just under the ground, day by day.
namespace rillstrand::snow {

/// A series beside the record, sorted by time, without missing values.
struct Series {
    Eigen::ArrayXd time_s;
    Eigen::ArrayXd value;
};

/// One stretch of the record, averaged over equal bins (an hour or less), and what is known of it.
struct SnowInput {
    Eigen::ArrayXd time_s; ///< UTC, middles of the bins, increasing; bins may be missing
    double bin_s = 0.0;
    Eigen::ArrayXd fibre_m;           ///< size n_channel
    Eigen::ArrayXXf temperature_degC; ///< row = bin, column = channel; NaN where missing
    std::optional<double> longitude_deg;
    Eigen::ArrayXd elevation_m, slope_deg, aspect_deg; ///< per channel, or empty
    double burial_depth_m = 0.0;
    double spatial_response_m = 1.0;
    double zero_offset_K = 0.0; ///< record minus truth at 0 degC, from baths; 0: unknown
    std::optional<Series> air_degC;
    campaign::Snow config;
};

enum class State { bare, snow, unknown };

/// Finer than bare or snow, for people to read; decided after the states.
enum class Condition { unknown, bare, quiet_bare, dry_snow, melting_snow };

const char* to_string(State state);
const char* to_string(Condition condition);

/// When cover came and went, a value a channel. Days count from the first of the record; -1: none.
struct SnowChannels {
    Eigen::ArrayXd fibre_m;
    std::vector<int> cover_onset; ///< first day of the longest cover, gaps of one day bridged
    std::vector<int> melt_out;    ///< first day without snow after it; -1 while it lasts
    Eigen::ArrayXd melt_out_sd_d; ///< NaN where there is no melt_out
    Eigen::ArrayXd covered_days;  ///< days that are more likely covered than not
    Eigen::ArrayXd covered_days_sd;
    std::vector<int> spells;         ///< covers, gaps of one day bridged
    Eigen::ArrayXd mean_probability; ///< over all days
    /// Swing under snow over swing when bare, both against the day's forcing; NaN where the
    /// channel was not long enough in both states. Small: well insulated. No depth follows from it.
    Eigen::ArrayXd insulation_index;
    /// Least depth of snow that would damp the clear days' swing so far, for 100 to 500 kg m-3;
    /// NaN where there is no index.
    Eigen::ArrayXd depth_at_least_m, depth_at_least_dense_m;
    Eigen::ArrayXd under_snow_degC; ///< where the channel stands under snow
};

/// Share of the stretch under snow, a value a day; NaN where no channel has a sample.
struct SnowCover {
    Eigen::ArrayXd covered_fraction, covered_fraction_sd;
};

/// Cover of the channels of one class of elevation, slope or aspect.
struct ClassCover {
    std::string kind, label;
    Eigen::Index channels = 0;
    SnowCover cover;
};

struct SnowFindings {
    std::string stretch;
    campaign::SnowMethod method = campaign::SnowMethod::model;
    Days days;
    /// Of snow on more than half of the day, by the model; row = day, column = channel; NaN where
    /// the channel has no sample at all.
    Eigen::ArrayXXd probability;
    Eigen::Array<State, Eigen::Dynamic, Eigen::Dynamic> state; ///< by the method asked for
    /// By the user's thresholds; size 0 where they were not said.
    Eigen::Array<State, Eigen::Dynamic, Eigen::Dynamic> rule_state;
    Eigen::Array<Condition, Eigen::Dynamic, Eigen::Dynamic> condition;
    SnowChannels channels;
    SnowCover cover;
    std::vector<ClassCover> classes;
    Eigen::ArrayXd forcing_K; ///< swing that open, bare ground would have shown, a value a day
    Eigen::ArrayXd forcing_log_sd;
    Eigen::ArrayXd between; ///< sd of the covered share between coherent answers, a value a day
    double leak = 0.0;      ///< share of a neighbour's temperature that the instrument lets in
    std::vector<std::string> cautions;
    std::string method_text;
};

/// Works out everything above.
/// @throws DataError if neither coordinates nor utc_offset_h say where a day begins, or the record
///         is shorter than two days
SnowFindings interpret(const SnowInput& input);

/// The common fixed-threshold rule: a day is snow where its swing and its mean lie below limits,
/// in runs of at least minimum_days; shorter runs are bare. Missing days are unknown and neither
/// make nor break a run.
Eigen::Array<State, Eigen::Dynamic, Eigen::Dynamic> threshold_states(const Days& days,
                                                                     double swing_below_K,
                                                                     double mean_below_degC,
                                                                     double minimum_days);

/// Onset, melt-out, spells and numbers of days, from states and probabilities.
SnowChannels find_channels(const Eigen::ArrayXd& fibre_m,
                           const Eigen::Array<State, Eigen::Dynamic, Eigen::Dynamic>& state,
                           const Eigen::ArrayXXd& probability);

/// Covered share of some channels (all where `which` is empty).
///
/// Errors of channels go together, since they share the day's weather and the model: with p the
/// probabilities and n channels, var = mean(p (1 - p)) (1 / n + r (1 - 1 / n)), r = 0.12 (chosen on
/// simulated winters), at least 0.004 squared.
SnowCover find_cover(const Days& days, const Eigen::ArrayXXd& probability,
                     const std::vector<Eigen::Index>& which = {});

} // namespace rillstrand::snow

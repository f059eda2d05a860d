// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/frame.hpp"

#include <optional>
#include <string>
#include <vector>

namespace rillstrand::stream {

/// How the reach is heated, as series in time (each with zero or more of its own mean).
struct Patterns {
    Eigen::ArrayXd gradient; ///< usual change of temperature per metre along the reach
    Eigen::ArrayXd change;   ///< change of the reach's temperature in time, per second
    Eigen::ArrayXd sun;      ///< 0 at night, 1 with the sun highest
    Eigen::Array<bool, Eigen::Dynamic, 1> night;
    double night_share = 0.0;
    bool sun_from_place = false; ///< from longitude and latitude, else told from the record
};
Patterns make_patterns(const Frame& frame, const StreamInput& input);

/// Sine of the sun's elevation (declination and equation of time after Spencer 1971, Search 2(5),
/// 172, from memory; better than half a degree).
double sine_of_sun(double time_s, double longitude_deg, double latitude_deg);

/// Weights in time that turn the record into one profile along the fibre.
///
/// A weighted mean over time of the mixing law Td = (1 - f) Tu + f Tin is the law again,
/// Ad = (1 - f) Au + f Ain with A = sum w T: the share does not depend on the weights, what
/// disturbs it does. Weights let the contrast Tin - T through and shut chosen patterns out.
struct Weighting {
    std::string name;      ///< what is shut out, in words
    Eigen::ArrayXd weight; ///< sum of weight times the reach's usual contrast is 1
    double inflow = 0.0;   ///< Ain: sum of weight times inflow temperature
    double total = 0.0;    ///< sum of weights: how Ain moves with a constant in Tin
    bool nights = false;
    double swing_K =
        0.0; ///< rms of what is left of the series: drift of the instrument counts against it
};

/// All weightings worth trying for water of that temperature.
/// @param inflow_degC  at the frame's times; absent: unknown, then every weighting sums to 0
///                     and the share comes from how the inflow damps the water's swings
std::vector<Weighting> make_weightings(const Frame& frame, const Patterns& patterns,
                                       const std::optional<Eigen::ArrayXd>& inflow_degC);

/// One weighting by its own recipe: a series to let through and patterns to shut out.
/// @return empty weight if nothing is left of the series
Weighting shut_out(const std::string& name, const Eigen::ArrayXd& series,
                   const std::vector<Eigen::ArrayXd>& patterns,
                   const Eigen::Array<bool, Eigen::Dynamic, 1>& use);

/// A profile in which inflows add up: -ln(Ain - A), in which an inflow of share f is a step of
/// -ln(1 - f).
struct Profile {
    Eigen::ArrayXd value;    ///< per channel
    Eigen::ArrayXd contrast; ///< Ain - A; where it is under 0.05 it is taken as that
    Eigen::ArrayXd white_variance;
};
Profile make_profile(const Frame& frame, const Weighting& weighting);

} // namespace rillstrand::stream

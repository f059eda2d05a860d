// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/scan.hpp"
#include "stream/weights.hpp"

#include <optional>

namespace rillstrand::stream {

/// One weighting's profile with its noise and background.
struct Reading {
    Weighting weighting;
    Profile profile;
    Roughness rough;
    double usual_sd = 0.0; ///< median standard deviation of a step along the reach

    Eigen::ArrayXd variance() const { return profile.white_variance + rough.nugget2; }
    Whitener whitener(const Frame& frame) const {
        return {frame.place_m, variance(), rough.roughness2};
    }
};

/// What a reach holds, read at its best weighting.
struct Solution {
    Reading reading;
    std::vector<Piece> pieces;
    ScanLevels levels;
    std::vector<Reading> readings; ///< every weighting, with the same pieces
};

/// Background held stiff over no more than this (the window of one side has twice the length).
inline constexpr double stiff_m = 30.0;

/// Does an offset of the fibre that is constant in time vanish in this weighting?
bool shuts_constants_out(const Weighting& weighting);

/// Reads one weighting given pieces.
/// @param start  where the search for the background begins, or none
Reading read(const Frame& frame, const Weighting& weighting, const std::vector<Piece>& pieces,
             const Roughness* start = nullptr);

/// Finds the pieces of a reach: tries all weightings, takes the one in which a step would
/// have the least standard deviation, finds pieces in it, measures the background anew
/// without them, and so on until the pieces stay.
///
/// @param inflow_sd_K  error of the inflow temperature; weightings whose shares move with it are
/// less
///                     liked (an inflow of 5 % stands for all)
Solution solve(const Frame& frame, const std::vector<Weighting>& weightings,
               const std::vector<Piece>& declared, double family, double inflow_sd_K = 0.0);

} // namespace rillstrand::stream

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/error.hpp"
#include "quality/baths.hpp"
#include "record/source.hpp"

#include <memory>
#include <string>
#include <vector>

namespace rillstrand::quality {

/// A bath that the record is adjusted to.
struct AdjustBath {
    std::string name;
    record::PlaceRange places; ///< inner channels, see inner_places
    BathReference reference;
};

/// A loss that is constant in time at one place of the fibre, as a step in ln(P_s / P_as).
struct StepLoss {
    double at_m = 0.0;
    double size = 0.0, size_sd = 0.0; ///< in the logarithm
    double apparent_K = 0.0;          ///< what it would do to temperatures beyond it, uncorrected
};

/// What was made of the references.
///
/// offset, offset-and-slope: T_adjusted = T + offset(t) + slope(t) (x - middle_m).
/// raman: T_adjusted = gamma / (ln(P_s / P_as) + C(t) - dalpha x - sum of steps before x), in
/// kelvin; with reverse powers the mean of both logarithms, in which attenuation and steps cancel.
/// Source: Hausner et al. (2011), Sensors 11, 10859-10879, doi:10.3390/s111110859; van de Giesen et
/// al. (2012), Sensors 12, 5471-5485, doi:10.3390/s120505471 (double-ended).
struct Adjustment {
    campaign::AdjustMethod method = campaign::AdjustMethod::offset;
    bool double_ended = false;
    double middle_m = 0.0;
    Eigen::ArrayXd offset_K, slope_K_m; ///< size n_time
    double gamma_K = 0.0, gamma_sd_K = 0.0;
    double dalpha_1_m = 0.0, dalpha_sd_1_m = 0.0;
    Eigen::ArrayXd c; ///< size n_time; NaN where no bath was read
    std::vector<StepLoss> steps;
    /// Standard deviation of what the references leave open at each channel, the same error at all
    /// times; size n_place, K.
    Eigen::ArrayXd channel_sd_K;
    Warnings warnings;
};

/// Slowly varying offset, or offset and slope, per trace: weighted least squares over the baths at
/// every trace, then smoothed in time as a random walk whose size and noise are told from its
/// differences.
/// @throws DataError if the slope cannot be had: fewer than two baths, or all at one place
Adjustment adjust_offset(const record::Source& source, const std::vector<AdjustBath>& baths,
                         bool with_slope, double response_m);

/// The Raman relation by weighted least squares over all baths and times: gamma, dalpha and step
/// losses shared, C of each trace free; weights by shot noise, var = s (1 / P_s + 1 / P_as) with s
/// from the residuals. Steps are found where the time mean of the logarithm jumps outside the baths
/// and the jump does not follow the water's temperature.
/// @throws DataError if the record has no powers, or which unknown the baths cannot tell
Adjustment adjust_raman(const record::Source& source, const std::vector<AdjustBath>& baths,
                        double response_m);

/// A record as adjusted; powers as they are.
std::unique_ptr<record::Source> adjusted(const record::Source& source, Adjustment adjustment);

} // namespace rillstrand::quality

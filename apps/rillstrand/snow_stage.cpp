// SPDX-License-Identifier: Apache-2.0
#include "snow_stage.hpp"

#include "record/bin.hpp"
#include "record/side_series.hpp"

#include <cmath>

namespace rillstrand::app {

namespace {

/// What the record reads at 0 degC by its baths: their mean bias, where it is beyond doubt.
double zero_offset_K(const Session& session) {
    double sum = 0.0, n = 0.0;
    for (const auto& bath : session.baths)
        if (std::isfinite(bath.bias_c) && std::abs(bath.bias_c) > 2.0 * bath.bias_sd_c) {
            sum += bath.bias_c;
            n += 1.0;
        }
    return n > 0.0 ? sum / n : 0.0;
}

Eigen::ArrayXd picked(const Eigen::ArrayXd& values, const std::vector<Eigen::Index>& which) {
    if (values.size() == 0)
        return {};
    Eigen::ArrayXd result(static_cast<Eigen::Index>(which.size()));
    for (std::size_t k = 0; k < which.size(); ++k)
        result(static_cast<Eigen::Index>(k)) = values(which[k]);
    return result;
}

/// Channels of the stretch but for coils and baths inside it.
std::vector<Eigen::Index> own_channels(const Session& session, record::PlaceRange range,
                                       const std::string& stretch) {
    std::vector<Eigen::Index> own;
    for (Eigen::Index j = range.first; j < range.first + range.count; ++j)
        if (session.names.stretch[static_cast<std::size_t>(j)] == stretch)
            own.push_back(j);
    return own;
}

snow::SnowInput snow_input(const Session& session, const campaign::Snow& config,
                           const Context& context) {
    const campaign::Stretch& stretch = *session.campaign.find_stretch(config.stretch);
    const record::Axes& axes = session.axes();
    const auto range = record::places_between(axes, stretch.from_m, stretch.to_m);
    const std::vector<Eigen::Index> own = own_channels(session, range, config.stretch);
    // Half an hour follows the day's wave and lets its noise be told; longer only for memory.
    const double bin_s = record::choose_bin_s(axes, range.count, 1800.0, 300e6);
    const auto binned = record::bin(*session.source, range, bin_s, context.progress);
    snow::SnowInput input;
    input.time_s = binned.time_s;
    input.bin_s = binned.bin_s;
    input.fibre_m = picked(axes.distance_m, own);
    input.temperature_degC.resize(binned.mean_degC.rows(), static_cast<Eigen::Index>(own.size()));
    for (std::size_t k = 0; k < own.size(); ++k)
        input.temperature_degC.col(static_cast<Eigen::Index>(k)) =
            binned.mean_degC.col(own[k] - range.first);
    input.burial_depth_m = stretch.burial_depth_m;
    input.spatial_response_m = session.spatial_response_m;
    input.zero_offset_K = zero_offset_K(session);
    input.config = config;
    if (session.placement) {
        const geo::ChannelPositions& c = session.placement->channels;
        input.longitude_deg = session.placement->first_lon;
        input.elevation_m = picked(c.z, own);
        input.slope_deg = picked(c.slope_deg, own);
        input.aspect_deg = picked(c.aspect_deg, own);
    }
    if (config.air) {
        const auto air = record::read_side_series(*config.air, session.campaign.record);
        input.air_degC = snow::Series{air.time_s, air.value};
    }
    return input;
}

} // namespace

void snow_stage(Session& session, const Context& context) {
    for (const auto& config : session.campaign.snows) {
        const snow::SnowInput input = snow_input(session, config, context);
        if (input.fibre_m.size() == 0)
            throw DataError(session.campaign.place(config.where) + ": stretch '" + config.stretch +
                            "' has no channel outside its coils and baths; widen it");
        context.progress.stage("telling snow from bare ground on '" + config.stretch + "'",
                               static_cast<double>(input.fibre_m.size()), "channels");
        session.snows.push_back(snow::interpret(input));
    }
}

} // namespace rillstrand::app

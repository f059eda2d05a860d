// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream_physics.hpp"

namespace rillstrand::physics {

/// The cable in the water: turns the water's temperatures into a record, trace by trace.
class Looker {
public:
    Looker(const Stream& stream, const Cable& cable, std::mt19937_64& random);

    /// A record with its axes and no temperatures yet.
    Record blank(double start_s, Eigen::Index traces) const;
    /// One trace: plumes, patches, spatial response and noise.
    void look(const Eigen::ArrayXd& water_degC, const Eigen::ArrayXd& light, Eigen::Index trace,
              Record& record, std::mt19937_64& random);
    /// Gaps, dead pieces and the order of channels.
    void spoil(Record& record, std::mt19937_64& random) const;

private:
    struct Tap {
        Eigen::Index first = 0;
        Eigen::ArrayXd weight;
    };
    void add_plumes(const Eigen::ArrayXd& water_degC, Eigen::ArrayXd& felt) const;
    void add_patches(const Eigen::ArrayXd& light, double air_degC, double sun_W_m2,
                     Eigen::ArrayXd& felt);

    Stream m_stream;
    Cable m_cable;
    Eigen::ArrayXd m_edges_m, m_fibre_at_edges_m; ///< slack
    Eigen::ArrayXd m_channel_m;                   ///< increasing with the water
    std::vector<Tap> m_taps;
    Eigen::ArrayXd m_noise_K, m_offset_K;
    std::vector<Eigen::ArrayXd> m_memory; ///< of buried pieces and pools
    double m_drift_K = 0.0;
};

} // namespace rillstrand::physics

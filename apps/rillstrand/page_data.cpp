// SPDX-License-Identifier: Apache-2.0
#include "page_data.hpp"

#include "background.hpp"
#include "column_stage.hpp"
#include "page.hpp"
#include "snow_tables.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::app {

namespace {

/// Numbers of one channel attribute with few digits: the page draws them, the tables keep them.
Json series(const Eigen::ArrayXd& values, int decimals) {
    Json list = Json::array();
    for (const double value : values) {
        if (std::isfinite(value))
            list.push_back(Json::parse(text::fixed(value, decimals)));
        else
            list.push_back(nullptr);
    }
    return list;
}

Json channels_json(const Session& session) {
    const record::ScanSummary& s = *session.scan;
    Json channels{{"fibre_m", series(session.axes().distance_m, 3)},
                  {"mean_c", series(s.mean_degC, 3)},
                  {"p05_c", series(s.p05_degC, 3)},
                  {"p95_c", series(s.p95_degC, 3)},
                  {"daily_range_c", series(s.daily_range_K, 3)},
                  {"noise_c", series(s.noise_K, 4)},
                  {"stretch", session.names.stretch},
                  {"flag", session.names.flag}};
    if (session.placement) {
        const geo::ChannelPositions& c = session.placement->channels;
        channels["lon"] = series(c.lon, 7);
        channels["lat"] = series(c.lat, 7);
        channels["position_sd_m"] = series(c.position_sd_m, 2);
        channels["along_sd_m"] = series(c.along_sd_m, 2);
        channels["across_sd_m"] = series(c.across_sd_m, 2);
        if (c.station_m.isFinite().any())
            channels["station_m"] = series(c.station_m, 1);
    }
    Json streams = Json::array();
    for (const auto& reach : session.streams) {
        const stream::StreamChannels& c = reach.channels;
        streams.push_back({{"stretch", reach.stretch},
                           {"fibre_m", series(c.fibre_m, 3)},
                           {"anomaly_c", series(c.anomaly_c, 4)},
                           {"background_c", series(c.background_c, 4)},
                           {"detection_limit_fraction", series(c.detection_limit_fraction, 5)}});
    }
    return {{"channels", channels}, {"streams", streams}};
}

/// The campaign's own picture under the map, cut to the cable and its surroundings.
Json background_json(const Session& session) {
    const geo::ChannelPositions& c = session.placement->channels;
    double west = 180.0, east = -180.0, south = 90.0, north = -90.0;
    for (Eigen::Index j = 0; j < c.lon.size(); ++j) {
        if (!std::isfinite(c.lon(j)))
            continue;
        west = std::min(west, c.lon(j));
        east = std::max(east, c.lon(j));
        south = std::min(south, c.lat(j));
        north = std::max(north, c.lat(j));
    }
    const double margin = 0.25 * std::max({east - west, north - south, 1e-3});
    const geo::Background picture =
        geo::warp_background(*session.campaign.page_background,
                             {west - margin, south - margin, east + margin, north + margin});
    std::string bytes;
    for (const std::byte b : picture.webp)
        bytes += static_cast<char>(b);
    return {{"webp", page::base64(bytes)},
            {"west", picture.west},
            {"south", picture.south},
            {"east", picture.east},
            {"north", picture.north}};
}

/// The record as a picture: means over cells of time and distance, 16 bits each.
class PictureBuilder {
public:
    explicit PictureBuilder(const record::Source& source) : m_source{source} {
        const record::Axes& axes = source.axes();
        constexpr Eigen::Index most_rows = 700, most_columns = 1400;
        m_step_t = (axes.n_time() + most_rows - 1) / most_rows;
        m_step_x = (axes.n_place() + most_columns - 1) / most_columns;
        m_rows = (axes.n_time() + m_step_t - 1) / m_step_t;
        m_columns = (axes.n_place() + m_step_x - 1) / m_step_x;
        m_sum = Eigen::ArrayXXd::Zero(m_rows, m_columns);
        m_n = Eigen::ArrayXXd::Zero(m_rows, m_columns);
    }

    Json build() {
        fill();
        const record::Axes& axes = m_source.axes();
        double low = std::numeric_limits<double>::infinity(), high = -low;
        for (Eigen::Index i = 0; i < m_rows; ++i)
            for (Eigen::Index j = 0; j < m_columns; ++j)
                if (m_n(i, j) > 0.0) {
                    low = std::min(low, m_sum(i, j) / m_n(i, j));
                    high = std::max(high, m_sum(i, j) / m_n(i, j));
                }
        std::string bytes;
        bytes.reserve(static_cast<std::size_t>(2 * m_rows * m_columns));
        const double scale = high > low ? 65534.0 / (high - low) : 0.0;
        for (Eigen::Index i = 0; i < m_rows; ++i)
            for (Eigen::Index j = 0; j < m_columns; ++j) {
                unsigned code = 65535; // missing
                if (m_n(i, j) > 0.0)
                    code =
                        static_cast<unsigned>(std::lround((m_sum(i, j) / m_n(i, j) - low) * scale));
                bytes += static_cast<char>(code & 255U);
                bytes += static_cast<char>(code >> 8U);
            }
        Json times = Json::array(), distances = Json::array();
        for (Eigen::Index i = 0; i < m_rows; ++i)
            times.push_back(
                std::round(axes.time_s(std::min(i * m_step_t + m_step_t / 2, axes.n_time() - 1))));
        for (Eigen::Index j = 0; j < m_columns; ++j)
            distances.push_back(Json::parse(text::fixed(
                axes.distance_m(std::min(j * m_step_x + m_step_x / 2, axes.n_place() - 1)), 2)));
        return {{"rows", m_rows},
                {"columns", m_columns},
                {"low_c", number_json(low)},
                {"high_c", number_json(high)},
                {"time_s", times},
                {"fibre_m", distances},
                {"traces_a_row", m_step_t},
                {"channels_a_column", m_step_x},
                {"codes", page::base64(bytes)}};
    }

private:
    void fill() {
        const record::Axes& axes = m_source.axes();
        const Eigen::Index rows = std::clamp<Eigen::Index>(m_source.block_rows(), 1, 2880);
        const Eigen::Index columns = std::max<Eigen::Index>(1, m_source.block_columns());
        Eigen::ArrayXXf block;
        for (Eigen::Index j = 0; j < axes.n_place(); j += columns)
            for (Eigen::Index i = 0; i < axes.n_time(); i += rows) {
                block.resize(std::min(rows, axes.n_time() - i),
                             std::min(columns, axes.n_place() - j));
                m_source.read(record::Quantity::temperature, i, j, block);
                for (Eigen::Index c = 0; c < block.cols(); ++c)
                    for (Eigen::Index r = 0; r < block.rows(); ++r)
                        if (!std::isnan(block(r, c))) {
                            m_sum((i + r) / m_step_t, (j + c) / m_step_x) +=
                                static_cast<double>(block(r, c));
                            m_n((i + r) / m_step_t, (j + c) / m_step_x) += 1.0;
                        }
            }
    }

    const record::Source& m_source;
    Eigen::Index m_step_t = 1, m_step_x = 1, m_rows = 0, m_columns = 0;
    Eigen::ArrayXXd m_sum, m_n;
};

} // namespace

std::string page_of(const Session& session, const Tables& tables, const Json& findings) {
    Json data = channels_json(session);
    data["findings"] = findings;
    data["picture"] = PictureBuilder{*session.source}.build();
    if (!session.snows.empty())
        data["snows"] = snow_page_json(session);
    if (session.campaign.page_background && session.placement)
        data["background"] = background_json(session);
    if (const Table* inflows = tables.find("inflows"))
        data["inflows"] = rows_json(*inflows);
    if (!session.columns.empty())
        data["columns"] = column_pictures(session);
    if (const Table* ties = tables.find("tie_points"))
        data["tie_points"] = rows_json(*ties);
    return page::render(session.campaign.name,
                        data.dump(-1, ' ', false, Json::error_handler_t::replace));
}

} // namespace rillstrand::app

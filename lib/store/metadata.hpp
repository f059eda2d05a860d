// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <cstdint>
#include <filesystem>
#include <string>
#include <vector>

/// What is added to a canonical record after its rows: each call opens the file, adds, and has it
/// on the disk again. Call them while the file still has its temporary name.
namespace rillstrand::store {

/// Coordinates of the channels. Arrays are empty where there is none, else of size n_place with NaN
/// for a channel without position.
struct Positions {
    Eigen::ArrayXd lon_deg, lat_deg; ///< WGS 84
    Eigen::ArrayXd x_m, y_m;      ///< in crs_wkt: easting and northing, or longitude and latitude
    Eigen::ArrayXd z_m;           ///< elevation, positive up
    Eigen::ArrayXd position_sd_m; ///< root mean square of the horizontal error
    Eigen::ArrayXd station_m;     ///< distance along the river or route
    std::string crs_wkt;          ///< of x and y; WKT 1 or 2
    std::string crs_name;         ///< e.g. `EPSG:25832`, for people
};

/// Adds positions as auxiliary coordinates of every quantity, with a grid mapping.
/// @throws DataError if an array is not of size n_place; MachineError if the file cannot be written
void add_positions(const std::filesystem::path& record_nc, const Positions& positions);

/// What is known about the quality of each channel.
struct ChannelQuality {
    Eigen::ArrayXd noise_c;                 ///< sd of the noise; empty or size n_place, NaN missing
    std::vector<std::uint8_t> flag;         ///< empty or size n_place; index into flag_meanings
    std::vector<std::string> flag_meanings; ///< one word each; meaning k has the value k
    std::vector<std::string> stretch;       ///< name of each channel's stretch, empty where none
};

/// Adds the ancillary variables `noise_c` and `flag` (flag_values, flag_meanings) and the names of
/// the stretches.
/// @throws DataError if an array is not of size n_place; MachineError if the file cannot be written
void add_quality(const std::filesystem::path& record_nc, const ChannelQuality& quality);

/// Discovery metadata by ACDD-1.3 (Attribute Convention for Data Discovery, ESIP, from memory).
/// Empty texts are left out. The coverage in time and space is told from the file itself, so call
/// this after add_positions.
struct Discovery {
    std::string title, summary, creator, institution, licence;
    std::vector<std::string> keywords;
    std::string references, comment;
    std::string date_created; ///< ISO 8601
    std::string product_version;
};

/// @throws MachineError if the file cannot be written
void set_discovery(const std::filesystem::path& record_nc, const Discovery& discovery);

} // namespace rillstrand::store

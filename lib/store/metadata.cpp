// SPDX-License-Identifier: Apache-2.0
#include "store/metadata.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "store/grid_mapping.hpp"
#include "store/library.hpp"
#include "store/rows_file.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

namespace rillstrand::store {

namespace {

constexpr double fill_float64 = 9.9692099683868690e36; ///< netCDF's own fill of doubles

constexpr std::array quantities{record::Quantity::temperature, record::Quantity::stokes,
                                record::Quantity::antistokes, record::Quantity::reverse_stokes,
                                record::Quantity::reverse_antistokes};

using Attributes = std::vector<std::pair<const char*, std::string>>;

hsize_t places_of(const H5File& file) {
    const Handle distance = file.variable("distance");
    const Handle space{H5Dget_space(distance.get()), H5Sclose};
    return static_cast<hsize_t>(H5Sget_simple_extent_npoints(space.get()));
}

void check_size(const H5File& file, const std::string& name, std::size_t size) {
    const hsize_t places = places_of(file);
    if (size != places)
        throw DataError{file.path().string() + ": " + name + " has " + std::to_string(size) +
                        " values for " + std::to_string(places) + " channels"};
}

/// A variable along the distance, in place of one of the same name.
Handle make_channel_variable(const H5File& file, const std::string& name, hid_t type,
                             const void* fill, const Attributes& attributes) {
    if (file.has(name))
        file.remove(name);
    Handle made = file.make_variable(name, type, {{places_of(file)}, {}, false, false}, fill);
    file.use_dimension(made.get(), "distance", 0);
    if (fill != nullptr)
        file.put(made.get(), "_FillValue", type, fill, 1);
    for (const auto& [key, text] : attributes)
        if (!text.empty())
            file.put(made.get(), key, text);
    return made;
}

/// @return false if there is nothing to write
bool put_real(const H5File& file, const std::string& name, const Eigen::ArrayXd& values,
              const Attributes& attributes) {
    if (values.size() == 0)
        return false;
    check_size(file, name, static_cast<std::size_t>(values.size()));
    const Handle made =
        make_channel_variable(file, name, H5T_IEEE_F64LE, &fill_float64, attributes);
    const Eigen::ArrayXd stored = values.isFinite().select(values, fill_float64);
    file.write(made.get(), H5T_NATIVE_DOUBLE, stored.data());
    double low = INFINITY, high = -INFINITY;
    for (const double v : values)
        if (std::isfinite(v)) {
            low = std::min(low, v);
            high = std::max(high, v);
        }
    if (low <= high)
        file.put(made.get(), "actual_range", std::vector<double>{low, high});
    return true;
}

/// Adds words to a blank-separated attribute of every quantity, each once.
void add_words(const H5File& file, const char* attribute, const std::vector<std::string>& words,
               bool temperature_only) {
    for (const record::Quantity quantity : quantities) {
        if (!file.has(variable_name(quantity)))
            continue;
        if (temperature_only && quantity != record::Quantity::temperature)
            continue;
        const Handle variable = file.variable(variable_name(quantity));
        std::string text = file.text(variable.get(), attribute);
        for (const auto& word : words)
            if ((" " + text + " ").find(" " + word + " ") == std::string::npos)
                text += (text.empty() ? "" : " ") + word;
        if (!text.empty())
            file.put(variable.get(), attribute, text);
    }
}

void put_grid_mapping(const H5File& file, const Positions& positions) {
    if (file.has("crs"))
        file.remove("crs");
    const Handle made = file.make_variable("crs", H5T_STD_I32LE, {{}, {}, false, false}, nullptr);
    const std::int32_t zero = 0;
    file.write(made.get(), H5T_NATIVE_INT32, &zero);
    if (!positions.crs_name.empty())
        file.put(made.get(), "long_name", positions.crs_name);
    const GridMapping mapping = grid_mapping_of(positions.crs_wkt);
    for (const auto& [key, text] : mapping.texts)
        file.put(made.get(), key.c_str(), text);
    for (const auto& [key, values] : mapping.numbers)
        file.put(made.get(), key.c_str(), values);
    file.put(made.get(), "crs_wkt", positions.crs_wkt);
    for (const record::Quantity quantity : quantities)
        if (file.has(variable_name(quantity)))
            file.put(file.variable(variable_name(quantity)).get(), "grid_mapping",
                     std::string{"crs"});
}

Eigen::ArrayXd read_present(const H5File& file, const std::string& name) {
    if (!file.has(name))
        return {};
    Eigen::ArrayXd values = file.read_all(name);
    std::vector<double> kept;
    for (const double v : values)
        if (v != fill_float64)
            kept.push_back(v);
    return Eigen::Map<const Eigen::ArrayXd>(kept.data(), static_cast<Eigen::Index>(kept.size()));
}

/// `P12DT3H4M5S` of a time span (ISO 8601).
std::string iso_duration(double seconds) {
    const auto whole = std::llround(seconds);
    std::string text = "P";
    if (whole >= 86400)
        text += std::to_string(whole / 86400) + "D";
    const auto rest = whole % 86400;
    if (rest == 0)
        return whole == 0 ? "PT0S" : text;
    text += "T";
    if (rest >= 3600)
        text += std::to_string(rest / 3600) + "H";
    if (rest % 3600 >= 60)
        text += std::to_string(rest % 3600 / 60) + "M";
    if (rest % 60 > 0)
        text += std::to_string(rest % 60) + "S";
    return text;
}

void put_time_coverage(const H5File& file) {
    const Eigen::ArrayXd bounds = file.read_all("time_bnds");
    if (bounds.size() < 2)
        return;
    const double begin = bounds(0), end = bounds(bounds.size() - 1);
    const hid_t root = file.id();
    file.put(root, "time_coverage_start", text::iso_time(begin));
    file.put(root, "time_coverage_end", text::iso_time(end));
    file.put(root, "time_coverage_duration", iso_duration(end - begin));
    if (bounds(1) > bounds(0))
        file.put(root, "time_coverage_resolution", iso_duration(bounds(1) - bounds(0)));
}

void put_space_coverage(const H5File& file) {
    const Eigen::ArrayXd lon = read_present(file, "lon"), lat = read_present(file, "lat");
    const hid_t root = file.id();
    if (lon.size() > 0 && lat.size() > 0) {
        file.put(root, "geospatial_lat_min", lat.minCoeff());
        file.put(root, "geospatial_lat_max", lat.maxCoeff());
        file.put(root, "geospatial_lat_units", std::string{"degrees_north"});
        file.put(root, "geospatial_lon_min", lon.minCoeff());
        file.put(root, "geospatial_lon_max", lon.maxCoeff());
        file.put(root, "geospatial_lon_units", std::string{"degrees_east"});
    }
    const Eigen::ArrayXd z = read_present(file, "z");
    if (z.size() > 0) {
        file.put(root, "geospatial_vertical_min", z.minCoeff());
        file.put(root, "geospatial_vertical_max", z.maxCoeff());
        file.put(root, "geospatial_vertical_units", std::string{"m"});
        file.put(root, "geospatial_vertical_positive", std::string{"up"});
    }
}

std::string joined(const std::vector<std::string>& words, const char* between) {
    std::string text;
    for (const auto& word : words)
        text += (text.empty() ? "" : between) + word;
    return text;
}

} // namespace

void add_positions(const std::filesystem::path& record_nc, const Positions& positions) {
    const LibraryLock lock;
    H5File file = H5File::reopen(record_nc);
    std::vector<std::string> names;
    const auto put = [&](const char* name, const Eigen::ArrayXd& values, const Attributes& about) {
        if (put_real(file, name, values, about))
            names.emplace_back(name);
    };
    put("lon", positions.lon_deg,
        {{"standard_name", "longitude"},
         {"long_name", "longitude, WGS 84"},
         {"units", "degrees_east"}});
    put("lat", positions.lat_deg,
        {{"standard_name", "latitude"},
         {"long_name", "latitude, WGS 84"},
         {"units", "degrees_north"}});
    const bool projected = grid_mapping_of(positions.crs_wkt).projected;
    put("x", positions.x_m,
        {{"standard_name", projected ? "projection_x_coordinate" : ""},
         {"long_name", projected ? "easting" : "longitude in crs"},
         {"units", projected ? "m" : "degrees"}});
    put("y", positions.y_m,
        {{"standard_name", projected ? "projection_y_coordinate" : ""},
         {"long_name", projected ? "northing" : "latitude in crs"},
         {"units", projected ? "m" : "degrees"}});
    put("z", positions.z_m,
        {{"standard_name", "altitude"},
         {"long_name", "elevation"},
         {"units", "m"},
         {"positive", "up"}});
    put("station_m", positions.station_m,
        {{"long_name", "distance along the river or route"}, {"units", "m"}});
    put("position_sd_m", positions.position_sd_m,
        {{"long_name", "standard deviation of the horizontal position, sqrt(var_x + var_y)"},
         {"units", "m"}});
    add_words(file, "coordinates", names, false);
    if (!positions.crs_wkt.empty() && positions.x_m.size() > 0)
        put_grid_mapping(file, positions);
    file.close();
}

void add_quality(const std::filesystem::path& record_nc, const ChannelQuality& quality) {
    const LibraryLock lock;
    H5File file = H5File::reopen(record_nc);
    std::vector<std::string> names;
    if (put_real(file, "noise_c", quality.noise_c,
                 {{"long_name", "standard deviation of the noise of one value"},
                  {"units", "degC"},
                  {"units_metadata", "temperature: difference"}}))
        names.emplace_back("noise_c");
    if (!quality.flag.empty()) {
        check_size(file, "flag", quality.flag.size());
        const Handle made =
            make_channel_variable(file, "flag", H5T_STD_U8LE, nullptr,
                                  {{"long_name", "quality of the channel"},
                                   {"standard_name", "quality_flag"},
                                   {"flag_meanings", joined(quality.flag_meanings, " ")}});
        std::vector<std::uint8_t> values(quality.flag_meanings.size());
        std::iota(values.begin(), values.end(), std::uint8_t{0});
        file.put(made.get(), "flag_values", H5T_STD_U8LE, values.data(), values.size());
        file.write(made.get(), H5T_NATIVE_UINT8, quality.flag.data());
        names.emplace_back("flag");
    }
    add_words(file, "ancillary_variables", names, true);
    if (!quality.stretch.empty()) {
        check_size(file, "stretch", quality.stretch.size());
        const Handle type{H5Tcopy(H5T_C_S1), H5Tclose};
        H5Tset_size(type.get(), H5T_VARIABLE);
        H5Tset_cset(type.get(), H5T_CSET_UTF8);
        const Handle made =
            make_channel_variable(file, "stretch", type.get(), nullptr,
                                  {{"long_name", "name of the stretch that the channel lies in"}});
        std::vector<const char*> texts;
        for (const auto& name : quality.stretch)
            texts.push_back(name.c_str());
        file.write(made.get(), type.get(), texts.data());
        add_words(file, "coordinates", {"stretch"}, false);
    }
    file.close();
}

void set_discovery(const std::filesystem::path& record_nc, const Discovery& discovery) {
    const LibraryLock lock;
    H5File file = H5File::reopen(record_nc);
    const hid_t root = file.id();
    file.put(root, "Conventions", std::string{"CF-1.11, ACDD-1.3"});
    const Attributes said{{"title", discovery.title},
                          {"summary", discovery.summary},
                          {"keywords", joined(discovery.keywords, ", ")},
                          {"creator_name", discovery.creator},
                          {"institution", discovery.institution},
                          {"creator_institution", discovery.institution},
                          {"license", discovery.licence},
                          {"references", discovery.references},
                          {"comment", discovery.comment},
                          {"date_created", discovery.date_created},
                          {"product_version", discovery.product_version},
                          {"standard_name_vocabulary", "CF Standard Name Table"},
                          {"cdm_data_type", "Station"}};
    for (const auto& [key, text] : said)
        if (!text.empty())
            file.put(root, key, text);
    put_time_coverage(file);
    put_space_coverage(file);
    file.close();
}

} // namespace rillstrand::store

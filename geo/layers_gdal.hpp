// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <gdal_priv.h>
#include <ogr_spatialref.h>

#include <filesystem>
#include <memory>
#include <string>
#include <vector>

/// What the writers of layers and rasters share of GDAL; included by sources of this room only.
namespace rillstrand::geo {

/// Collects the failures that GDAL tells while this lives, instead of printing them.
class GdalFailures {
public:
    GdalFailures();
    ~GdalFailures();
    GdalFailures(const GdalFailures&) = delete;
    GdalFailures& operator=(const GdalFailures&) = delete;
    GdalFailures(GdalFailures&&) = delete;
    GdalFailures& operator=(GdalFailures&&) = delete;

    bool any() const { return !m_texts.empty(); }
    /// The library's words, one line; never empty.
    std::string text() const;
    /// @throws MachineError naming the file, if any failure was told
    void throw_if_any(const std::filesystem::path& file) const;
    /// @throws MachineError naming the file
    [[noreturn]] void give_up(const std::filesystem::path& file) const;
    void add(std::string text) { m_texts.push_back(std::move(text)); }

private:
    std::vector<std::string> m_texts;
};

/// A configuration option of GDAL for this thread, put back at the end.
class GdalOption {
public:
    GdalOption(std::string key, const std::string& value);
    ~GdalOption();
    GdalOption(const GdalOption&) = delete;
    GdalOption& operator=(const GdalOption&) = delete;
    GdalOption(GdalOption&&) = delete;
    GdalOption& operator=(GdalOption&&) = delete;

private:
    std::string m_key;
    std::string m_before;
    bool m_was_set = false;
};

struct CloseDataset {
    void operator()(GDALDataset* dataset) const { GDALClose(dataset); }
};
using Dataset = std::unique_ptr<GDALDataset, CloseDataset>;

/// A file in GDAL's memory, under a name of its own, gone at the end.
class MemoryFile {
public:
    /// @param ending  the end of its name, by which drivers know it
    explicit MemoryFile(const std::string& ending);
    ~MemoryFile();
    MemoryFile(const MemoryFile&) = delete;
    MemoryFile& operator=(const MemoryFile&) = delete;
    MemoryFile(MemoryFile&&) = delete;
    MemoryFile& operator=(MemoryFile&&) = delete;

    const std::string& name() const { return m_name; }
    std::string content() const;

private:
    std::string m_name;
};

/// A driver by name, registered if need be; only those that this room writes with are known.
GDALDriver* driver(const std::string& name);

/// The coordinate system of an EPSG code or WKT, x (east) before y (north).
/// @throws DataError naming what was given, if PROJ does not know it
OGRSpatialReference coordinate_system(const std::string& crs);

/// WGS 84, longitude before latitude.
OGRSpatialReference wgs84();

/// Options of GDAL as its C interface wants them.
class GdalOptions {
public:
    GdalOptions() = default;
    GdalOptions(std::initializer_list<std::string> items);
    void add(const std::string& item);
    char** get() { return m_list.List(); }

private:
    CPLStringList m_list;
};

} // namespace rillstrand::geo

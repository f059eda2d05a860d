// SPDX-License-Identifier: Apache-2.0
#include "layers_gdal.hpp"

#include "base/error.hpp"

#include <cpl_conv.h>
#include <cpl_error.h>
#include <cpl_vsi.h>
#include <gdal_frmts.h>
#include <ogrsf_frmts.h>

#include <functional>
#include <map>

namespace rillstrand::geo {

namespace {
void CPL_STDCALL collect(CPLErr severity, CPLErrorNum, const char* message) {
    if (severity < CE_Failure)
        return;
    auto* failures = static_cast<GdalFailures*>(CPLGetErrorHandlerUserData());
    std::string line = message != nullptr ? message : "";
    for (char& c : line)
        if (c == '\n' || c == '\r')
            c = ' ';
    failures->add(std::move(line));
}
} // namespace

GdalFailures::GdalFailures() {
    CPLPushErrorHandlerEx(collect, this);
}
GdalFailures::~GdalFailures() {
    CPLPopErrorHandler();
}

std::string GdalFailures::text() const {
    return m_texts.empty() ? std::string{"no reason given"} : m_texts.front();
}

void GdalFailures::throw_if_any(const std::filesystem::path& file) const {
    if (any())
        give_up(file);
}

void GdalFailures::give_up(const std::filesystem::path& file) const {
    throw MachineError{file.string() + ": cannot be written (" + text() +
                       "); make room on the disk or choose an output folder that can be written"};
}

GdalOption::GdalOption(std::string key, const std::string& value) : m_key{std::move(key)} {
    const char* before = CPLGetThreadLocalConfigOption(m_key.c_str(), nullptr);
    m_was_set = before != nullptr;
    if (m_was_set)
        m_before = before;
    CPLSetThreadLocalConfigOption(m_key.c_str(), value.c_str());
}

GdalOption::~GdalOption() {
    CPLSetThreadLocalConfigOption(m_key.c_str(), m_was_set ? m_before.c_str() : nullptr);
}

MemoryFile::MemoryFile(const std::string& ending) {
    // The object's address tells apart the files of threads at work at the same time.
    m_name = "/vsimem/rillstrand_" +
             std::to_string(std::hash<const void*>{}(static_cast<const void*>(this))) + "_" +
             ending;
}

MemoryFile::~MemoryFile() {
    VSIUnlink(m_name.c_str());
}

std::string MemoryFile::content() const {
    vsi_l_offset size = 0;
    const GByte* bytes = VSIGetMemFileBuffer(m_name.c_str(), &size, FALSE);
    std::string text;
    if (bytes != nullptr)
        text.assign(bytes, bytes + size);
    return text;
}

GDALDriver* driver(const std::string& name) {
    // The registry is GDAL's and locks itself; registering a driver twice leaves the first one.
    static const std::map<std::string, void (*)()> known{{"GPKG", RegisterOGRGeoPackage},
                                                         {"FlatGeobuf", RegisterOGRFlatGeobuf},
                                                         {"GPX", RegisterOGRGPX},
                                                         {"ESRI Shapefile", RegisterOGRShape},
                                                         {"GTiff", GDALRegister_GTiff},
                                                         {"COG", GDALRegister_COG},
                                                         {"PNG", GDALRegister_PNG},
                                                         {"JPEG", GDALRegister_JPEG},
                                                         {"JP2OpenJPEG", GDALRegister_JP2OpenJPEG},
                                                         {"MEM", GDALRegister_MEM},
                                                         {"WEBP", GDALRegister_WEBP}};
    GDALDriver* found = GetGDALDriverManager()->GetDriverByName(name.c_str());
    if (found == nullptr) {
        if (const auto entry = known.find(name); entry != known.end())
            entry->second();
        found = GetGDALDriverManager()->GetDriverByName(name.c_str());
    }
    if (found == nullptr)
        throw MachineError{"this machine's GDAL has no driver " + name +
                           "; install Debian's libgdal package in full"};
    return found;
}

OGRSpatialReference coordinate_system(const std::string& crs) {
    const GdalFailures failures;
    OSRSetPROJEnableNetwork(0);
    OGRSpatialReference system;
    // A name of a file or an address is never followed.
    GdalOptions options{"ALLOW_NETWORK_ACCESS=NO", "ALLOW_FILE_ACCESS=NO"};
    if (system.SetFromUserInput(crs.c_str(), options.get()) != OGRERR_NONE)
        throw DataError{"coordinate system '" + crs + "' is not known (" + failures.text() +
                        "); give an EPSG code such as EPSG:25832, or WKT"};
    system.SetAxisMappingStrategy(OAMS_TRADITIONAL_GIS_ORDER);
    return system;
}

OGRSpatialReference wgs84() {
    return coordinate_system("EPSG:4326");
}

GdalOptions::GdalOptions(std::initializer_list<std::string> items) {
    for (const auto& item : items)
        add(item);
}

void GdalOptions::add(const std::string& item) {
    m_list.AddString(item.c_str());
}

} // namespace rillstrand::geo

// SPDX-License-Identifier: Apache-2.0
#include "base/text.hpp"
#include "layers_gdal.hpp"
#include "layers_ogr.hpp"
#include "layers_write.hpp"

#include <cpl_conv.h>
#include <ogrsf_frmts.h>

#include <algorithm>
#include <array>
#include <fstream>
#include <set>
#include <system_error>

namespace rillstrand::geo::writing {

namespace {
constexpr std::size_t longest_name = 10;  // of a field in a dBase file
constexpr std::size_t longest_text = 254; // bytes of a text in a dBase file

/// Drops vowels from the end, but none that begins a word, until the name is short enough.
std::string squeezed(std::string name) {
    for (std::size_t i = name.size(); i-- > 1 && name.size() > longest_name;)
        if (std::string{"aeiou"}.find(name[i]) != std::string::npos && name[i - 1] != '_')
            name.erase(i, 1);
    for (std::size_t i = name.size(); i-- > 1 && name.size() > longest_name;)
        if (name[i] == '_')
            name.erase(i, 1);
    return name.substr(0, longest_name);
}

std::vector<std::string> short_names(const Table& table) {
    std::vector<std::string> names;
    std::set<std::string> taken;
    for (const auto& column : table.columns()) {
        const std::string wanted = squeezed(text::slug(column.name));
        std::string name = wanted;
        for (int n = 2; !taken.insert(name).second; ++n) {
            const std::string number = std::to_string(n);
            name = wanted.substr(0, longest_name - number.size()) + number;
        }
        names.push_back(std::move(name));
    }
    return names;
}

std::unique_ptr<OGRFieldDefn> dbase_field(const Column& column, const std::string& name) {
    auto field = ogr_field(column, name);
    if (column.kind == ColumnKind::boolean) {
        field->SetSubType(OFSTNone);
        field->SetWidth(1);
    }
    if (column.kind == ColumnKind::time) {
        field->SetType(OFTString);
        field->SetWidth(24);
    }
    if (column.kind == ColumnKind::text) {
        std::size_t width = 1;
        for (const auto& cell : column.text)
            width = std::max(width, utf8(cell).size());
        field->SetWidth(static_cast<int>(std::min(width, longest_text)));
    }
    return field;
}

/// A text cut to what the format holds, never inside a character.
std::string cut(std::string text) {
    if (text.size() <= longest_text)
        return text;
    std::size_t end = longest_text;
    while (end > 0 && (static_cast<unsigned char>(text[end]) & 0xC0U) == 0x80U)
        --end;
    return text.substr(0, end);
}

void set_dbase_cell(OGRFeature& feature, int field, const Column& column, std::size_t row) {
    const bool as_text = column.kind == ColumnKind::time || column.kind == ColumnKind::text;
    if (!as_text)
        return set_cell(feature, field, column, row);
    const std::string cell = cut(utf8(cell_text(column, row)));
    if (cell.empty())
        feature.SetFieldNull(field);
    else
        feature.SetField(field, cell.c_str());
}

struct Part {
    std::filesystem::path file;
    std::string name; ///< inside the archive
};

/// What every short name stands for.
std::string key_table(const Table& table, const std::vector<std::string>& names) {
    std::vector<std::string> full, titles, units;
    for (const auto& column : table.columns()) {
        full.push_back(column.name);
        titles.push_back(column.title);
        units.push_back(column.unit);
    }
    Table key{"fields"};
    key.add_text("short_name", "name in the shapefile", names);
    key.add_text("name", "name of the attribute", full);
    key.add_text("title", "what it is", titles);
    key.add_text("unit", "unit", units);
    return to_csv(key);
}

void fill(GDALDataset& file, const Job& job, const Named& named,
          const std::vector<std::string>& names) {
    OGRSpatialReference crs;
    if (!job.set->crs.empty())
        crs = coordinate_system(job.set->crs);
    // A height that is not known has no mark in this format: no heights then, z is an attribute.
    const bool with_z =
        named.layer->geometry != GeometryKind::point && !has_unknown_height(*named.layer);
    const auto type =
        with_z ? ogr_type(named.layer->geometry) : OGR_GT_Flatten(ogr_type(named.layer->geometry));
    GdalOptions options{"ENCODING=UTF-8", "DBF_DATE_LAST_UPDATE=" + job.set->now.substr(0, 10)};
    OGRLayer* layer = file.CreateLayer(named.name.c_str(), named.has_geometry() ? &crs : nullptr,
                                       type, options.get());
    if (layer == nullptr)
        return;
    const auto& columns = named.table().columns();
    for (std::size_t j = 0; j < columns.size(); ++j) {
        const auto field = dbase_field(columns[j], names[j]);
        if (layer->CreateField(field.get()) != OGRERR_NONE)
            return;
    }
    OGRFeature feature{layer->GetLayerDefn()};
    for (std::size_t row = 0; row < named.table().rows(); ++row) {
        feature.SetFID(OGRNullFID);
        for (std::size_t j = 0; j < columns.size(); ++j)
            set_dbase_cell(feature, static_cast<int>(j), columns[j], row);
        if (named.has_geometry())
            feature.SetGeometryDirectly(ogr_geometry(*named.layer, row, with_z).release());
        if (layer->CreateFeature(&feature) != OGRERR_NONE)
            return;
    }
}

/// @return false if the archive cannot take it
bool add_to_zip(void* zip, const Part& part) {
    std::ifstream in{part.file, std::ios::binary};
    if (!in || CPLCreateFileInZip(zip, part.name.c_str(), nullptr) != CE_None)
        return false;
    std::array<char, 65536> buffer{};
    while (in.read(buffer.data(), buffer.size()) || in.gcount() > 0)
        if (CPLWriteFileInZip(zip, buffer.data(), static_cast<int>(in.gcount())) != CE_None)
            return false;
    return in.eof() && CPLCloseFileInZip(zip) == CE_None;
}

void zip_parts(const std::filesystem::path& archive, std::vector<Part> parts) {
    std::sort(parts.begin(), parts.end(),
              [](const Part& a, const Part& b) { return a.name < b.name; });
    GdalFailures failures;
    void* zip = CPLCreateZip(archive.c_str(), nullptr);
    if (zip == nullptr)
        failures.give_up(archive);
    bool good = true;
    for (const auto& part : parts)
        good = good && add_to_zip(zip, part);
    if (CPLCloseZip(zip) != CE_None || !good)
        failures.give_up(archive);
    failures.throw_if_any(archive);
}

/// The loose files of a shapefile, removed at the end whatever happens.
class LooseFiles {
public:
    explicit LooseFiles(std::filesystem::path folder) : m_folder{std::move(folder)} {
        std::error_code error;
        std::filesystem::remove_all(m_folder, error);
        std::filesystem::create_directories(m_folder, error);
        if (error)
            throw MachineError{m_folder.string() + ": cannot be made (" + error.message() +
                               "); choose an output folder that can be written"};
    }
    ~LooseFiles() {
        std::error_code ignored;
        std::filesystem::remove_all(m_folder, ignored);
    }
    LooseFiles(const LooseFiles&) = delete;
    LooseFiles& operator=(const LooseFiles&) = delete;
    LooseFiles(LooseFiles&&) = delete;
    LooseFiles& operator=(LooseFiles&&) = delete;

    const std::filesystem::path& folder() const { return m_folder; }
    std::vector<Part> parts() const {
        std::vector<Part> list;
        for (const auto& entry : std::filesystem::directory_iterator{m_folder})
            list.push_back({entry.path(), entry.path().filename().string()});
        return list;
    }

private:
    std::filesystem::path m_folder;
};

void warn_of_cuts(const Named& named, WrittenLayers& written) {
    for (const auto& column : named.table().columns())
        if (column.kind == ColumnKind::text &&
            std::any_of(column.text.begin(), column.text.end(),
                        [](const std::string& cell) { return utf8(cell).size() > longest_text; }))
            written.warnings.push_back(
                {"shapefile-text-cut", "layers/" + named.name + ".shp.zip: texts of " +
                                           column.name +
                                           " longer than 254 bytes are cut; take them from "
                                           "layers.gpkg"});
}

void write_one(const Job& job, const Named& named, const std::filesystem::path& archive) {
    const LooseFiles loose{job.folder / "layers" / ("." + named.name + ".parts")};
    const auto names = short_names(named.table());
    const auto path = loose.folder() / (named.name + (named.has_geometry() ? ".shp" : ".dbf"));
    const GdalFailures failures;
    Dataset file{driver("ESRI Shapefile")->Create(path.c_str(), 0, 0, 0, GDT_Unknown, nullptr)};
    if (!file)
        failures.give_up(path);
    fill(*file, job, named, names);
    file.reset();
    failures.throw_if_any(path);
    write_text(loose.folder() / (named.name + "_fields.csv"), key_table(named.table(), names));
    zip_parts(archive, loose.parts());
}
} // namespace

void write_shapefile(const Job& job, WrittenLayers& written) {
    for (const auto& named : job.layers) {
        const auto name = std::filesystem::path{"layers"} / (named.name + ".shp.zip");
        std::error_code ignored;
        std::filesystem::remove(job.folder / name, ignored);
        write_one(job, named, job.folder / name);
        warn_of_cuts(named, written);
        written.files.push_back(name);
    }
}

} // namespace rillstrand::geo::writing

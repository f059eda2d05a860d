// SPDX-License-Identifier: Apache-2.0
#include "campaign/draft.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <zlib.h>

#include <algorithm>
#include <map>
#include <sstream>

namespace fs = std::filesystem;

namespace rillstrand::campaign {

namespace {

/// The first lines of a text file, plain or gzip; nothing where it is no text.
std::vector<std::string> first_lines(const fs::path& file) {
    std::string head(1U << 16U, '\0');
    gzFile in = gzopen(file.c_str(), "rb");
    if (in == nullptr)
        return {};
    const int got = gzread(in, head.data(), static_cast<unsigned>(head.size()));
    gzclose(in);
    if (got <= 0)
        return {};
    head.resize(static_cast<std::size_t>(got));
    if (head.find('\0') != std::string::npos)
        return {};
    if (head.compare(0, 3, "\xEF\xBB\xBF") == 0)
        head.erase(0, 3);
    std::vector<std::string> lines;
    std::istringstream stream{head};
    for (std::string line; lines.size() < 40 && std::getline(stream, line);) {
        if (!line.empty() && line.back() == '\r')
            line.pop_back();
        lines.push_back(line);
    }
    return lines;
}

std::vector<std::string> cells_of(const std::string& line) {
    char delimiter = ',';
    for (const char c : {'\t', ';'})
        if (line.find(c) != std::string::npos)
            delimiter = c;
    if (line.find(delimiter) == std::string::npos)
        delimiter = ' ';
    std::vector<std::string> cells;
    std::istringstream stream{line};
    for (std::string cell; std::getline(stream, cell, delimiter);)
        if (delimiter != ' ' || !cell.empty())
            cells.push_back(cell);
    return cells;
}

std::string lower(std::string text) {
    for (char& c : text)
        if (c >= 'A' && c <= 'Z')
            c = static_cast<char>(c - 'A' + 'a');
    return text;
}

bool has(const std::vector<std::string>& cells, const std::string& start) {
    return std::any_of(cells.begin(), cells.end(),
                       [&](const std::string& cell) { return lower(cell).rfind(start, 0) == 0; });
}

/// Digits of a name count as one: `trace_20310405_06.csv` and `trace_20310405_07.csv` are alike.
std::string pattern_of(const fs::path& relative) {
    std::string name;
    for (const char c : relative.filename().string()) {
        const bool digit = c >= '0' && c <= '9';
        if (digit && !name.empty() && name.back() == '*')
            continue;
        name += digit ? '*' : c;
    }
    return (relative.parent_path() / name).generic_string();
}

class Looker {
public:
    explicit Looker(const fs::path& folder) : m_folder{folder} {}

    FolderFacts look() {
        std::vector<fs::path> files;
        std::error_code error;
        for (auto it =
                 fs::recursive_directory_iterator{m_folder,
                                                  fs::directory_options::skip_permission_denied};
             it != fs::recursive_directory_iterator{}; ++it) {
            const std::string name = it->path().filename().string();
            if (name.front() == '.' || name == "out" || it.depth() > 2) {
                if (it->is_directory(error))
                    it.disable_recursion_pending();
                continue;
            }
            if (it->is_directory(error)) {
                if (it->path().extension() == ".zarr") {
                    files.push_back(it->path());
                    it.disable_recursion_pending();
                }
                continue;
            }
            files.push_back(it->path());
            if (files.size() > 200000)
                break;
        }
        std::sort(files.begin(), files.end());
        for (const auto& file : files)
            take(file);
        for (const auto& [pattern, group] : m_records) {
            m_facts.record_files += group.count;
            m_facts.record_patterns.push_back(group.count == 1 ? group.first : pattern);
        }
        if (!m_records.empty()) {
            const auto most = std::max_element(
                m_records.begin(), m_records.end(),
                [](const auto& a, const auto& b) { return a.second.count < b.second.count; });
            m_facts.layout = most->second.layout;
            tell_more(m_folder / most->second.first);
        }
        return m_facts;
    }

private:
    struct Group {
        std::string first;
        std::string layout;
        std::size_t count = 0;
    };

    void take(const fs::path& file) {
        const std::string name = fs::relative(file, m_folder).generic_string();
        const std::string extension = lower(file.extension().string());
        if (extension == ".toml")
            return;
        if (extension == ".nc" || extension == ".zarr")
            add_record(name, "grid");
        else if (extension == ".gpkg" || extension == ".geojson" || extension == ".shp" ||
                 extension == ".fgb" || extension == ".kml" || extension == ".gpx")
            m_facts.lines.push_back(name);
        else if (extension == ".tif" || extension == ".tiff" || extension == ".asc")
            m_facts.rasters.push_back(name);
        else if (extension == ".csv" || extension == ".txt" || extension == ".dat" ||
                 extension == ".tsv" || extension == ".gz")
            take_text(file, name);
        else
            m_facts.unknown.push_back(name);
    }

    void take_text(const fs::path& file, const std::string& name) {
        // Files of one pattern are alike: the first one tells.
        const std::string pattern = pattern_of(name);
        const auto known = m_records.find(pattern);
        if (known != m_records.end()) {
            ++known->second.count;
            return;
        }
        std::vector<std::string> header;
        for (const auto& line : first_lines(file)) {
            if (line.empty() || line.front() == '#')
                continue;
            header = cells_of(line);
            if (header.size() > 1)
                break;
        }
        const bool time = has(header, "time"), distance = has(header, "distance"),
                   temperature = has(header, "temperature");
        std::size_t numbers = 0;
        for (const auto& cell : header)
            if (text::parse_number(cell))
                ++numbers;
        if ((has(header, "fibre_m") || has(header, "cable_m")) && has(header, "x"))
            m_facts.tie_points.push_back(name);
        else if (time && distance && temperature)
            add_record(name, "tall");
        else if (distance && temperature)
            add_record(name, "single");
        else if (time && numbers > 0 && numbers + 1 == header.size())
            add_record(name, "wide");
        else if (time)
            m_facts.series.push_back({name, header});
        else
            m_facts.unknown.push_back(name);
    }

    void add_record(const std::string& name, const std::string& layout) {
        Group& group = m_records[pattern_of(name)];
        if (group.count++ == 0) {
            group.first = name;
            group.layout = layout;
        }
    }

    void tell_more(const fs::path& file) {
        if (m_facts.layout == "grid")
            return;
        bool header_seen = false;
        for (const auto& line : first_lines(file)) {
            const bool dated = line.size() > 15 && line.find(':') != std::string::npos &&
                               line.find('-') != std::string::npos;
            if (!line.empty() && line.front() == '#') {
                if (dated)
                    m_facts.stamp_in_header = true;
                if (dated && line.find('Z') != std::string::npos)
                    m_facts.zone_said = true;
                continue;
            }
            const auto cells = cells_of(line);
            if (!header_seen) {
                header_seen = true;
                if (m_facts.layout == "wide") {
                    std::vector<double> distances;
                    for (const auto& cell : cells)
                        if (const auto value = text::parse_number(cell))
                            distances.push_back(*value);
                    if (distances.size() > 1) {
                        m_facts.first_m = distances.front();
                        m_facts.last_m = distances.back();
                    }
                }
                continue;
            }
            m_facts.example = line.substr(0, 60);
            if (!cells.empty() && (cells.front().find('Z') != std::string::npos ||
                                   cells.front().find('+') != std::string::npos))
                m_facts.zone_said = true;
            break;
        }
        const std::string name = file.filename().string();
        m_facts.stamp_in_name = std::count_if(name.begin(), name.end(),
                                              [](char c) { return c >= '0' && c <= '9'; }) >= 12;
    }

    const fs::path& m_folder;
    FolderFacts m_facts;
    std::map<std::string, Group> m_records;
};

std::string quoted(const std::string& text) {
    std::string result = "\"";
    for (const char c : text) {
        if (c == '"' || c == '\\')
            result += '\\';
        result += static_cast<unsigned char>(c) < 32 ? ' ' : c;
    }
    return result + "\"";
}

std::string listed(const std::vector<std::string>& names) {
    std::string list;
    for (const auto& name : names)
        list += (list.empty() ? "" : ", ") + quoted(name);
    return list;
}

void write_record(std::ostringstream& out, const FolderFacts& facts) {
    out << "[record]\n";
    if (facts.record_patterns.empty())
        out << "# say: no file here looks like a record; name its files\nfiles = "
               "[\"traces/*.csv\"]\n";
    else
        out << "# told: " << facts.record_files << " files, layout " << facts.layout
            << "\nfiles = [" << listed(facts.record_patterns) << "]\n";
    if (!facts.layout.empty())
        out << "layout = " << quoted(facts.layout) << "\n";
    if (!facts.zone_said && facts.layout != "grid")
        out << "# say: the stamps carry no offset; in which zone did the instrument's clock run?\n"
               "time_zone = \"Etc/UTC\"\n";
    out << "# say: does a stamp stand for the start, the middle or the end of its averaging "
           "interval?\n"
           "stamp = \"middle\"\n";
    if (facts.layout == "single" && !facts.stamp_in_header) {
        out << "[record.text]\n# say: where each trace's time stands; in the file's name, for "
               "example\n";
        out << (facts.stamp_in_name ? "" : "# ") << "time_from_name = \"trace_%Y%m%d_%H%M%S\"\n";
    }
    out << "\n";
}

void write_placement(std::ostringstream& out, const FolderFacts& facts) {
    if (facts.tie_points.empty()) {
        out << "# say: no file here holds tie points (columns fibre_m,x,y and, better, "
               "sd_m,label).\n"
               "# Without [placement] there are tables, findings and a page, but no map layers.\n"
               "# [placement]\n# crs = \"EPSG:25832\"\n# tie_points = \"tie_points.csv\"\n\n";
        return;
    }
    out << "[placement]\n# say: the coordinate system of the tie points; a file cannot tell it\n"
           "crs = \"EPSG:25832\"\ntie_points = "
        << quoted(facts.tie_points.front()) << "\n";
    for (std::size_t i = 1; i < facts.tie_points.size(); ++i)
        out << "# also found: " << facts.tie_points[i] << "\n";
    for (const auto& line : facts.lines)
        out << "# say: is this the line the cable lies on (route), or a river's (river)?\n# route "
               "= "
            << quoted(line) << "\n";
    for (const auto& raster : facts.rasters)
        out << "# say: is this the ground's elevation?\n# elevation = " << quoted(raster) << "\n";
    out << "\n";
}

} // namespace

FolderFacts look_into(const fs::path& folder) {
    if (!fs::is_directory(folder))
        throw DataError{folder.string() +
                        ": there is no such folder; give the folder of the traces"};
    return Looker{folder}.look();
}

std::string draft_campaign(const FolderFacts& facts) {
    std::ostringstream out;
    out << "# A first campaign file. Lines with 'say:' wait for you, lines with 'told:' come from "
           "the "
           "files.\n# Then: rillstrand check campaign.toml, and rillstrand run campaign.toml\n\n";
    out << "[campaign]\n# say: a name for the page and the layers\nname = \"Unnamed campaign\"\n\n";
    write_record(out, facts);
    write_placement(out, facts);
    const bool told = facts.last_m > facts.first_m;
    out << "# say: where on the fibre each part of the cable lies\n"
           "# (setting: streambed, ground, water, air, coil or bath)\n";
    if (told)
        out << "# told: the record reaches from " << text::number(facts.first_m) << " to "
            << text::number(facts.last_m) << " m\n";
    out << "[[stretch]]\nname = \"reach\"\nsetting = \"streambed\"\nfrom_m = "
        << text::number(told ? facts.first_m : 0.0)
        << "\nto_m = " << text::number(told ? facts.last_m : 1000.0) << "\n\n";
    out << "# say: the stretches of fibre in reference baths; without them nobody can say how far "
           "off\n"
           "# the temperatures are\n# [[bath]]\n# name = \"ice bath\"\n# from_m = 20.0\n# to_m = "
           "45.0\n"
           "# temperature_c = 0.0\n\n";
    out << "[[stream]]\nstretch = \"reach\"\n# say: does the water run toward increasing or "
           "decreasing "
           "fibre distance?\nflow = \"increasing\"\n"
           "# say, if you know it: the groundwater's temperature and the discharge at one end\n"
           "# inflow_temperature_c = 9.6\n# discharge_m3s = 0.042\n";
    for (const auto& series : facts.series) {
        out << "\n# found a series: " << series.file << " with the columns ";
        for (std::size_t i = 0; i < series.columns.size() && i < 8; ++i)
            out << (i > 0 ? ", " : "") << series.columns[i];
        out << "\n# it may serve as a bath's probe, a groundwater temperature, a discharge or "
               "weather\n";
    }
    if (!facts.unknown.empty()) {
        out << "\n# could not be told: ";
        for (std::size_t i = 0; i < facts.unknown.size() && i < 10; ++i)
            out << (i > 0 ? ", " : "") << facts.unknown[i];
        out << (facts.unknown.size() > 10 ? ", …\n" : "\n");
    }
    return out.str();
}

} // namespace rillstrand::campaign

// SPDX-License-Identifier: Apache-2.0
#include "campaign/read.hpp"

#include "campaign/read_parts.hpp"

#include <algorithm>
#include <fstream>
#include <sstream>
#include <stdexcept>

namespace fs = std::filesystem;

namespace rillstrand::campaign {

namespace {

constexpr std::uintmax_t largest_bytes = 4U << 20U;
constexpr int deepest = 64;

std::string content_of(const fs::path& file) {
    std::error_code error;
    const fs::file_status status = fs::status(file, error);
    if (!fs::exists(status))
        throw DataError{file.string() + ": there is no such file; give the campaign file's path"};
    if (fs::is_directory(status))
        throw DataError{file.string() + ": is a folder; give the campaign file in it, such as " +
                        (file / "campaign.toml").string()};
    if (fs::is_regular_file(status) && fs::file_size(file, error) > largest_bytes)
        throw DataError{file.string() +
                        ": is over 4 MB, too large for a campaign file; give the right file"};
    std::ifstream stream{file, std::ios::binary};
    std::stringstream text;
    text << stream.rdbuf();
    if (!stream)
        throw DataError{file.string() + ": cannot be read; check the rights"};
    return text.str();
}

/// Nesting of brackets outside of texts and comments: the parser recurses into each.
int nesting(const std::string& toml_text) {
    int depth = 0, most = 0;
    char quote = 0;
    bool comment = false;
    for (std::size_t i = 0; i < toml_text.size(); ++i) {
        const char c = toml_text[i];
        if (c == '\n') {
            comment = false;
            quote = 0;
        } else if (comment) {
            continue;
        } else if (quote != 0) {
            if (c == '\\' && quote == '"')
                ++i;
            else if (c == quote)
                quote = 0;
        } else if (c == '"' || c == '\'') {
            quote = c;
        } else if (c == '#') {
            comment = true;
        } else if (c == '[' || c == '{') {
            most = std::max(most, ++depth);
        } else if (c == ']' || c == '}') {
            depth = std::max(0, depth - 1);
        }
    }
    return most;
}

void read_head(TableReader& root, Campaign& campaign) {
    campaign.name = campaign.folder.filename().string();
    campaign.output = campaign.folder / "out";
    const auto used_defaults = [&root](const std::string& name) {
        root.used_default("campaign.name", name);
        root.used_default("campaign.output", "out");
    };
    if (!root.has("campaign")) {
        used_defaults(campaign.name);
        return;
    }
    root.table("campaign", [&campaign](TableReader& in) {
        in.text("name", campaign.name);
        in.used_default("name", campaign.name);
        in.path("output", campaign.output, false);
        in.used_default("output", "out");
        in.text("summary", campaign.summary);
        in.text("creator", campaign.creator);
        in.text("institution", campaign.institution);
        in.text("licence", campaign.licence);
        in.texts("keywords", campaign.keywords);
    });
}

void read_tail(TableReader& root, Campaign& campaign) {
    root.table("layers", [&campaign](TableReader& in) {
        std::vector<std::string> names;
        const std::map<std::string, LayerFormat> words{{"gpkg", LayerFormat::gpkg},
                                                       {"geojson", LayerFormat::geojson},
                                                       {"flatgeobuf", LayerFormat::flatgeobuf},
                                                       {"kml", LayerFormat::kml},
                                                       {"gpx", LayerFormat::gpx},
                                                       {"shapefile", LayerFormat::shapefile},
                                                       {"csv", LayerFormat::csv}};
        if (in.texts("formats", names)) {
            campaign.layers.formats.clear();
            for (const auto& name : names) {
                const auto found = words.find(name);
                if (found == words.end())
                    in.problem("formats", "'" + name +
                                              "' is no format; write any of gpkg, geojson, "
                                              "flatgeobuf, kml, gpx, shapefile, csv");
                else if (std::find(campaign.layers.formats.begin(), campaign.layers.formats.end(),
                                   found->second) == campaign.layers.formats.end())
                    campaign.layers.formats.push_back(found->second);
            }
        }
        in.used_default("formats", "gpkg, geojson");
        in.real("corridor_m", campaign.layers.corridor_m, {0.0, 1000.0, true});
    });
    root.table("page",
               [&campaign](TableReader& in) { in.path("background", campaign.page_background); });
}

} // namespace

Campaign parse_campaign(const std::string& toml_text, const fs::path& file) {
    Campaign campaign;
    campaign.file = fs::absolute(file).lexically_normal();
    campaign.folder = campaign.file.parent_path();
    Reading reading;
    reading.folder = campaign.folder;
    reading.file_name = file.filename().string();
    if (nesting(toml_text) > deepest)
        throw DataError{reading.file_name + ": brackets are nested deeper than " +
                        std::to_string(deepest) + "; a campaign file needs three levels"};
    toml::table parsed;
    try {
        parsed = toml::parse(toml_text, reading.file_name);
    } catch (const toml::parse_error& error) {
        const auto& begin = error.source().begin;
        throw DataError{reading.file_name + ":" + std::to_string(begin.line) + ":" +
                        std::to_string(begin.column) + ": is not TOML: " +
                        std::string{error.description()} + "; correct this place"};
    } catch (const std::logic_error& error) {
        throw DataError{reading.file_name + ": is not TOML: " + error.what() +
                        "; compare its lines with a campaign file that works"};
    }
    TableReader root{reading, parsed, ""};
    read_head(root, campaign);
    read_record(root, campaign);
    read_stretches(root, campaign);
    read_marks(root, campaign);
    read_placement(root, campaign);
    read_streams(root, campaign);
    read_snows(root, campaign);
    read_columns(root, campaign);
    read_beds(root, campaign);
    read_tail(root, campaign);
    root.finish();
    check_together(campaign, reading);
    reading.problems.throw_if_any();
    campaign.defaults = reading.defaults;
    return campaign;
}

Campaign read_campaign(const fs::path& file) {
    return parse_campaign(content_of(file), file);
}

} // namespace rillstrand::campaign

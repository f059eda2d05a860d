// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/gather.hpp"
#include "record/text_input.hpp"

#include <zlib.h>

#include <filesystem>
#include <fstream>
#include <string>
#include <utility>
#include <vector>

namespace rillstrand::testing {

namespace fs = std::filesystem;

/// Keeps every row that comes.
class KeepSink final : public record::Sink {
public:
    void add_row(double time_s, const std::vector<Eigen::ArrayXf>& rows) override {
        times_s.push_back(time_s);
        temperature_degC.push_back(rows.at(0));
        all.push_back(rows);
    }
    record::RecordHead head;
    std::vector<double> times_s;
    std::vector<Eigen::ArrayXf> temperature_degC;
    std::vector<std::vector<Eigen::ArrayXf>> all;
};

inline fs::path fresh_folder(const std::string& name) {
    const fs::path folder = fs::path{RILLSTRAND_SCRATCH} / name;
    fs::remove_all(folder);
    fs::create_directories(folder);
    return folder;
}

inline void put(const fs::path& path, const std::string& content) {
    fs::create_directories(path.parent_path());
    std::ofstream{path, std::ios::binary} << content;
}

inline void put_gzip(const fs::path& path, const std::string& content) {
    gzFile file = gzopen(path.c_str(), "wb");
    gzwrite(file, content.data(), static_cast<unsigned>(content.size()));
    gzclose(file);
}

inline std::pair<record::GatherReport, KeepSink*> gather(const campaign::Record& options,
                                                         const fs::path& folder, KeepSink& sink) {
    NoProgress progress;
    const auto files = record::find_files(options.files, folder);
    auto report = record::gather_text(
        options, files, folder,
        [&sink](const record::RecordHead& head) -> record::Sink& {
            sink.head = head;
            return sink;
        },
        progress);
    return {std::move(report), &sink};
}

/// What is said when a record is refused, without the folder's name.
inline std::string refusal(const fs::path& folder, campaign::Record options) {
    KeepSink sink;
    if (options.files.empty())
        options.files = {"*.csv"};
    try {
        gather(options, folder, sink);
    } catch (const DataError& error) {
        std::string what = error.what();
        for (std::size_t at = 0; (at = what.find(folder.string() + "/")) != std::string::npos;)
            what.erase(at, folder.string().size() + 1);
        return what;
    }
    return "(taken)";
}

} // namespace rillstrand::testing

// SPDX-License-Identifier: Apache-2.0
#include "record/gather.hpp"

#include "base/text.hpp"
#include "record/gather_parts.hpp"
#include "record/row_order.hpp"

#include <tbb/parallel_for.h>

#include <mutex>

namespace rillstrand::record {

namespace {

/// Heads of all files, several at a time; all problems together.
std::vector<TextHead> read_heads(const campaign::Record& record,
                                 const std::vector<std::filesystem::path>& files) {
    std::vector<TextHead> heads(files.size());
    std::vector<std::string> wrong(files.size());
    tbb::parallel_for(std::size_t{0}, files.size(), [&](std::size_t i) {
        try {
            heads[i] = read_head(files[i], record);
        } catch (const DataError& error) {
            wrong[i] = error.what();
        }
    });
    Problems problems;
    constexpr std::size_t most_told = 20;
    std::size_t more = 0;
    for (const auto& problem : wrong) {
        if (problem.empty())
            continue;
        if (problems.list().size() < most_told)
            problems.add(problem);
        else
            ++more;
    }
    if (more > 0)
        problems.add("and " + std::to_string(more) + " more files of the record");
    problems.throw_if_any();
    return heads;
}

void check_layouts(const std::vector<TextHead>& heads) {
    const auto word = [](campaign::Layout layout) {
        return layout == campaign::Layout::wide   ? "wide"
               : layout == campaign::Layout::tall ? "tall"
                                                  : "single";
    };
    for (const auto& head : heads)
        if (head.layout != heads.front().layout)
            throw DataError{head.file.string() + ": has the layout " + word(head.layout) +
                            ", but " + heads.front().file.string() + " has " +
                            word(heads.front().layout) +
                            "; give files of one layout, or say record.layout"};
}

Eigen::ArrayXd distances_of(const TextHead& head) {
    return Eigen::Map<const Eigen::ArrayXd>(head.distance_m.data(),
                                            static_cast<Eigen::Index>(head.distance_m.size()));
}

} // namespace

void refuse(const std::filesystem::path& file, std::size_t line, const std::string& what) {
    throw DataError{file.string() + ":" + std::to_string(line) + ": " + what};
}

double read_stamp(const StampReader& stamps, std::string_view stamp,
                  std::optional<double> previous_s, const std::filesystem::path& file,
                  std::size_t line) {
    try {
        return stamps.read(stamp, previous_s);
    } catch (const DataError& error) {
        refuse(file, line, error.what());
    }
}

Inspection inspect_text(const campaign::Record& record,
                        const std::vector<std::filesystem::path>& files) {
    const StampReader stamps{record};
    const std::vector<TextHead> heads = read_heads(record, files);
    check_layouts(heads);
    Inspection inspection;
    inspection.layout = heads.front().layout;
    inspection.files = files;
    if (inspection.layout == campaign::Layout::wide) {
        inspection.distance_m = distances_of(heads.front());
        for (const auto& head : heads)
            check_axes(inspection.distance_m, heads.front().file.string(), distances_of(head),
                       head.file.string(), record.align);
    }
    for (const auto& head : heads)
        if (!head.stamp.empty()) {
            try {
                stamps.read(head.stamp, std::optional<double>{-1e18}, head.stamp_format);
            } catch (const DataError& error) {
                throw DataError{head.file.string() + ": " + error.what()};
            }
        }
    return inspection;
}

GatherReport gather_text(const campaign::Record& record,
                         const std::vector<std::filesystem::path>& files,
                         const std::filesystem::path& scratch, const MakeSink& make_sink,
                         Progress& progress) {
    const StampReader stamps{record};
    const std::vector<TextHead> heads = read_heads(record, files);
    check_layouts(heads);
    GatherReport report;
    report.layout = heads.front().layout;
    report.files = files;
    const TextJob job{record, heads, stamps, scratch, make_sink, progress, report};
    switch (report.layout) {
    case campaign::Layout::single:
        gather_single(job);
        break;
    case campaign::Layout::wide:
        gather_wide(job);
        break;
    default:
        gather_tall(job);
        break;
    }
    return report;
}

} // namespace rillstrand::record

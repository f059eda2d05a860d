// SPDX-License-Identifier: Apache-2.0
#include "record/gather.hpp"

#include "base/text.hpp"
#include "record/gather_parts.hpp"
#include "record/row_order.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>

namespace rillstrand::record {

namespace {

constexpr std::size_t most_told = 20;

/// Tells the first problems in full and how many more there are.
void throw_some(const std::vector<std::string>& wrong) {
    Problems problems;
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
        problems.add("and " + std::to_string(more) + " more problems in files of the record");
    problems.throw_if_any();
}

const char* word(campaign::Layout layout) {
    return layout == campaign::Layout::wide   ? "wide"
           : layout == campaign::Layout::tall ? "tall"
                                              : "single";
}

/// Heads of all files, several at a time; the files' problems beside them.
std::vector<TextHead> read_heads(const campaign::Record& record, const StampReader& stamps,
                                 const std::vector<std::filesystem::path>& files,
                                 std::vector<std::string>& wrong) {
    std::vector<TextHead> heads(files.size());
    wrong.assign(files.size(), {});
    tbb::parallel_for(std::size_t{0}, files.size(), [&](std::size_t i) {
        try {
            heads[i] = read_head(files[i], record, stamps);
        } catch (const DataError& error) {
            wrong[i] = error.what();
        }
    });
    const TextHead* first = nullptr;
    for (std::size_t i = 0; i < files.size(); ++i) {
        if (!wrong[i].empty())
            continue;
        if (first == nullptr)
            first = &heads[i];
        if (heads[i].layout != first->layout)
            wrong[i] = files[i].string() + ": has the layout " + word(heads[i].layout) + ", but " +
                       first->file.string() + " has " + word(first->layout) +
                       "; give files of one layout, or say record.layout";
        else if (heads[i].power_cells.size() != first->power_cells.size())
            wrong[i] = files[i].string() + ": has not the powers that " + first->file.string() +
                       " has; give files of one kind";
    }
    return heads;
}

Eigen::ArrayXd distances_of(const TextHead& head) {
    return Eigen::Map<const Eigen::ArrayXd>(head.distance_m.data(),
                                            static_cast<Eigen::Index>(head.distance_m.size()));
}

/// What stands in the first row of a wide or tall file and need not wait for the long work.
void check_first_row(const StampReader& stamps, const TextHead& head) {
    ClockSequence sequence{stamps};
    read_stamp(stamps, sequence, head.stamp, head.file, head.first_data_line);
}

} // namespace

void refuse(const std::filesystem::path& file, std::size_t line, const std::string& what) {
    throw DataError{file.string() + (line > 0 ? ":" + std::to_string(line) : std::string{}) + ": " +
                    what};
}

std::string ragged(std::size_t cells, std::size_t needed) {
    return "has " + std::to_string(cells) + (cells == 1 ? " cell" : " cells") +
           " where the header has " + std::to_string(needed) + "; complete or remove the line";
}

std::string no_number(std::string_view cell, const std::string& what, char decimal) {
    constexpr std::size_t longest = 60;
    const bool other_mark = std::all_of(cell.begin(), cell.end(), [](char c) {
        return (c >= '0' && c <= '9') || c == '.' || c == ',' || c == '-' || c == '+';
    });
    const std::string mend =
        other_mark && !cell.empty() && cell.find(decimal == ',' ? '.' : ',') != std::string::npos
            ? (decimal == ',' ? "the decimal mark is taken for a comma, see record.text.decimal"
                              : "the decimal mark is taken for a point, see record.text.decimal")
            : "correct it, or add the text to record.missing";
    return "'" + std::string{cell.substr(0, longest)} + (cell.size() > longest ? "…" : "") +
           "' is no " + what + "; " + mend;
}

double read_stamp(const StampReader& stamps, ClockSequence& sequence, std::string_view stamp,
                  const std::filesystem::path& file, std::size_t line) {
    std::optional<ClockStamp> clock;
    try {
        clock = stamps.read(stamp);
    } catch (const DataError& error) {
        refuse(file, line, error.what());
    }
    return sequence.next(*clock, stamp, file, line);
}

void tell_reversed(std::size_t files, GatherReport& report) {
    if (files > 0)
        report.warnings.push_back({"record-distances-reversed",
                                   std::to_string(files) + (files == 1 ? " file" : " files") +
                                       " of the record with falling distances: their rows were "
                                       "turned round"});
}

Inspection inspect_text(const campaign::Record& record,
                        const std::vector<std::filesystem::path>& files) {
    const StampReader stamps{record};
    std::vector<std::string> wrong;
    const std::vector<TextHead> heads = read_heads(record, stamps, files, wrong);
    Inspection inspection;
    inspection.files = files;
    const TextHead* first = nullptr;
    for (std::size_t i = 0; i < files.size(); ++i) {
        if (!wrong[i].empty())
            continue;
        const TextHead& head = heads[i];
        if (first == nullptr) {
            first = &head;
            inspection.layout = head.layout;
            inspection.distance_m = distances_of(head);
        }
        try {
            if (head.layout != campaign::Layout::single)
                check_first_row(stamps, head);
            if (head.layout == campaign::Layout::wide)
                check_axes(inspection.distance_m, first->file.string(), distances_of(head),
                           head.file.string(), record.align);
        } catch (const DataError& error) {
            wrong[i] = error.what();
        }
    }
    throw_some(wrong);
    return inspection;
}

GatherReport gather_text(const campaign::Record& record,
                         const std::vector<std::filesystem::path>& files,
                         const std::filesystem::path& scratch, const MakeSink& make_sink,
                         Progress& progress) {
    if (files.empty())
        throw DataError{"record.files: names no file; give the files of the record"};
    const StampReader stamps{record};
    std::vector<std::string> wrong;
    const std::vector<TextHead> heads = read_heads(record, stamps, files, wrong);
    throw_some(wrong);
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

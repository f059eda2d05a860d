// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/gather_parts.hpp"
#include "record/scratch_file.hpp"
#include "record/text_input.hpp"

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace rillstrand::record {

/// Where one row of a wide table lies.
struct RowPlace {
    double time_s = 0.0;
    std::uint64_t offset = 0; ///< unpacked
    std::uint32_t length = 0;
    std::uint32_t file = 0;
    std::uint32_t line = 0;
};

/// Goes through wide tables once and notes where each row lies and when it was.
/// @return in order of files and lines
/// @throws DataError naming file and line of a stamp that cannot be read
std::vector<RowPlace> index_rows(const TextJob& job);

/// Fetches rows of wide tables by their place.
///
/// Rows of plain files are read where they lie. A gzip file whose rows are wanted in the order of
/// its lines is unpacked as they are wanted; where that is not so, all gzip files are unpacked into
/// a scratch file first.
class RowFetcher {
public:
    /// @param places  in the order in which they will be wanted
    RowFetcher(const TextJob& job, const std::vector<RowPlace>& places);
    RowFetcher(const RowFetcher&) = delete;
    RowFetcher& operator=(const RowFetcher&) = delete;
    RowFetcher(RowFetcher&&) = delete;
    RowFetcher& operator=(RowFetcher&&) = delete;
    ~RowFetcher();

    /// Rows [begin, end); valid until the next call.
    std::vector<std::string_view> fetch(std::size_t begin, std::size_t end);

private:
    void unpack_all();
    void read_plain(const RowPlace& first, std::size_t bytes, char* to);
    int opened(std::uint32_t file);
    void read_stream(const RowPlace& place, char* to);
    [[noreturn]] void refuse_changed(std::uint32_t file) const;

    const TextJob& m_job;
    const std::vector<RowPlace>& m_places;
    std::vector<bool> m_packed;
    std::optional<ScratchFile> m_scratch;
    std::vector<std::uint64_t> m_scratch_offset; ///< of each packed file
    std::vector<std::pair<std::uint32_t, int>> m_open;
    std::unique_ptr<LineSource> m_stream; ///< of the packed file that is being read
    std::uint32_t m_stream_file = 0;
    std::string m_text;
};

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/wide_rows.hpp"

#include <fcntl.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstring>

namespace rillstrand::record {

namespace {

constexpr std::size_t most_rows = 20000000;
constexpr std::size_t most_open = 64;
constexpr std::uint64_t largest_join = std::uint64_t{1} << 16U; ///< bytes between two rows

/// The stamp of a row; of a row that starts with it nothing else need be looked at.
std::string_view row_stamp(const TextHead& head, std::string_view line, std::size_t number,
                           std::vector<std::string_view>& cells) {
    if (head.time_cell == 0 && head.delimiter != ' ' && line.find('"') == std::string_view::npos)
        return trim(line.substr(0, line.find(head.delimiter)));
    const std::size_t last = head.time_cell + head.time_cells;
    split_cells(line, head.delimiter, cells, last);
    if (cells.size() < last)
        refuse(head.file, number, ragged(cells.size(), head.cells));
    return stamp_of(head, cells);
}

} // namespace

std::vector<RowPlace> index_rows(const TextJob& job) {
    std::vector<RowPlace> places;
    std::vector<std::string_view> cells;
    ClockSequence sequence{job.stamps};
    for (std::size_t f = 0; f < job.heads.size(); ++f) {
        const TextHead& head = job.heads[f];
        LineSource source{head.file};
        std::string_view line;
        std::uint64_t taken = 0;
        while (source.next(line)) {
            if (source.taken() > taken)
                job.progress.advance(static_cast<double>(source.taken() - taken) * 1e-6);
            taken = source.taken();
            const std::size_t number = source.number();
            if (number < head.first_data_line || is_comment(line, job.record.text))
                continue;
            const double time_s = read_stamp(
                job.stamps, sequence, row_stamp(head, line, number, cells), head.file, number);
            if (places.size() >= most_rows)
                refuse(head.file, number,
                       "the record has over 20000000 traces here, more than are taken at once; "
                       "part it into several campaigns");
            places.push_back({time_s, source.offset(), static_cast<std::uint32_t>(line.size()),
                              static_cast<std::uint32_t>(f), static_cast<std::uint32_t>(number)});
        }
    }
    sequence.finish();
    return places;
}

RowFetcher::RowFetcher(const TextJob& job, const std::vector<RowPlace>& places)
    : m_job{job}, m_places{places} {
    bool any = false;
    for (const auto& head : job.heads) {
        m_packed.push_back(ByteSource{head.file}.packed());
        any = any || m_packed.back();
    }
    if (!any)
        return;
    // Streams serve if every packed file is wanted once, and from its first line to its last.
    const auto before = [](const RowPlace& a, const RowPlace& b) {
        return a.file != b.file || a.offset < b.offset;
    };
    std::vector<bool> seen(job.heads.size(), false);
    bool in_order = true;
    for (std::size_t i = 0; i < places.size() && in_order; ++i) {
        const std::uint32_t file = places[i].file;
        if (!m_packed[file])
            continue;
        if (i > 0 && places[i - 1].file == file)
            in_order = before(places[i - 1], places[i]);
        else
            in_order = !seen[file];
        seen[file] = true;
    }
    if (!in_order)
        unpack_all();
}

RowFetcher::~RowFetcher() {
    for (const auto& [file, fd] : m_open)
        ::close(fd);
}

void RowFetcher::unpack_all() {
    m_scratch.emplace(m_job.scratch);
    m_scratch_offset.assign(m_packed.size(), 0);
    std::vector<char> buffer(std::size_t{1} << 20U);
    for (std::size_t f = 0; f < m_packed.size(); ++f) {
        if (!m_packed[f])
            continue;
        m_scratch_offset[f] = m_scratch->size();
        ByteSource bytes{m_job.heads[f].file};
        while (const std::size_t got = bytes.read(buffer.data(), buffer.size()))
            m_scratch->append(buffer.data(), got);
    }
}

void RowFetcher::refuse_changed(std::uint32_t file) const {
    throw DataError{m_job.heads[file].file.string() +
                    ": changed while it was read; run again when it is complete"};
}

int RowFetcher::opened(std::uint32_t file) {
    for (const auto& [open_file, fd] : m_open)
        if (open_file == file)
            return fd;
    // Few files are open at a time, however many a record has.
    if (m_open.size() >= most_open) {
        ::close(m_open.front().second);
        m_open.erase(m_open.begin());
    }
    const std::string name = m_job.heads[file].file.string();
    const int fd = ::open(name.c_str(), O_RDONLY | O_CLOEXEC);
    if (fd < 0)
        throw DataError{name + ": cannot be opened again (" + std::strerror(errno) + ")"};
    m_open.emplace_back(file, fd);
    return fd;
}

void RowFetcher::read_plain(const RowPlace& first, std::size_t bytes, char* to) {
    if (m_packed[first.file]) {
        m_scratch->read(m_scratch_offset[first.file] + first.offset, to, bytes);
        return;
    }
    if (read_at(opened(first.file), first.offset, to, bytes) != static_cast<std::int64_t>(bytes))
        refuse_changed(first.file);
}

void RowFetcher::read_stream(const RowPlace& place, char* to) {
    if (!m_stream || m_stream_file != place.file) {
        m_stream = std::make_unique<LineSource>(m_job.heads[place.file].file);
        m_stream_file = place.file;
    }
    std::string_view line;
    do {
        if (!m_stream->next(line))
            refuse_changed(place.file);
    } while (m_stream->offset() < place.offset);
    if (m_stream->offset() != place.offset || line.size() != place.length)
        refuse_changed(place.file);
    std::copy(line.begin(), line.end(), to);
}

std::vector<std::string_view> RowFetcher::fetch(std::size_t begin, std::size_t end) {
    std::vector<std::size_t> starts;
    m_text.clear();
    for (std::size_t i = begin; i < end;) {
        const RowPlace& first = m_places[i];
        const std::size_t start = m_text.size();
        if (m_packed[first.file] && !m_scratch) {
            m_text.resize(start + first.length);
            starts.push_back(start);
            read_stream(first, m_text.data() + start);
            ++i;
            continue;
        }
        // Rows that lie one behind the other are read in one go.
        std::uint64_t stop = first.offset;
        for (; i < end && m_places[i].file == first.file && m_places[i].offset >= stop &&
               m_places[i].offset - stop <= largest_join;
             ++i) {
            starts.push_back(start + (m_places[i].offset - first.offset));
            stop = m_places[i].offset + m_places[i].length;
        }
        m_text.resize(start + (stop - first.offset));
        read_plain(first, stop - first.offset, m_text.data() + start);
    }
    std::vector<std::string_view> rows;
    for (std::size_t i = begin; i < end; ++i)
        rows.emplace_back(m_text.data() + starts[i - begin], m_places[i].length);
    return rows;
}

} // namespace rillstrand::record

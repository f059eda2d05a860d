// SPDX-License-Identifier: Apache-2.0
#include "record/text_input.hpp"

#include "base/error.hpp"

#include <glob.h>
#include <zlib.h>

#include <algorithm>
#include <array>
#include <cstring>
#include <set>

namespace fs = std::filesystem;

namespace rillstrand::record {

namespace {

constexpr std::size_t buffer_bytes = 1U << 20U;
constexpr std::size_t longest_line = 64U << 20U;

class GzipFile {
public:
    explicit GzipFile(const fs::path& file) : m_name{file.string()} {
        std::error_code error;
        if (fs::is_directory(file, error))
            throw DataError{m_name +
                            ": is a folder where a text file is needed; name the files in it"};
        if (!fs::exists(file, error))
            throw DataError{m_name + ": there is no such file; correct the name"};
        m_file = gzopen(file.c_str(), "rb");
        if (m_file == nullptr)
            throw DataError{m_name + ": cannot be opened; check the rights"};
        gzbuffer(m_file, static_cast<unsigned>(buffer_bytes));
    }
    GzipFile(const GzipFile&) = delete;
    GzipFile& operator=(const GzipFile&) = delete;
    GzipFile(GzipFile&&) = delete;
    GzipFile& operator=(GzipFile&&) = delete;
    ~GzipFile() { gzclose(m_file); }

    std::size_t read(char* to, std::size_t count) {
        const int got = gzread(m_file, to, static_cast<unsigned>(count));
        int code = Z_OK;
        const char* what = gzerror(m_file, &code);
        if (got < 0 || code == Z_BUF_ERROR)
            throw DataError{m_name + (code == Z_BUF_ERROR
                                          ? ": the gzip stream is cut short; copy the file again"
                                          : ": cannot be read (" + std::string{what} +
                                                "); copy the file again")};
        return static_cast<std::size_t>(got);
    }

private:
    std::string m_name;
    gzFile m_file = nullptr;
};

} // namespace

std::vector<fs::path> find_files(const std::vector<std::string>& patterns, const fs::path& folder) {
    std::set<fs::path> found;
    Problems problems;
    for (const auto& pattern : patterns) {
        const std::string full = (folder / pattern).string();
        glob_t matches{};
        const int status = glob(full.c_str(), 0, nullptr, &matches);
        for (std::size_t i = 0; i < matches.gl_pathc; ++i)
            found.insert(fs::path{matches.gl_pathv[i]}.lexically_normal());
        globfree(&matches);
        if (status != 0)
            problems.add("record.files: '" + pattern + "' matches no file in " + folder.string() +
                         "; correct the pattern or put the files there");
    }
    problems.throw_if_any();
    return {found.begin(), found.end()};
}

struct LineSource::Data {
    explicit Data(const fs::path& path) : file{path}, gzip{path} {}
    fs::path file;
    GzipFile gzip;
    std::string buffer; ///< bytes that are not yet given out, from `start` on
    std::size_t start = 0;
    std::size_t consumed = 0; ///< unpacked bytes before buffer[0]
    std::size_t number = 0;
    std::size_t offset = 0;
    bool ended = false;
    bool opened = false;

    bool fill() {
        if (ended)
            return false;
        consumed += start;
        buffer.erase(0, start);
        start = 0;
        const std::size_t had = buffer.size();
        if (had > longest_line)
            throw DataError{file.string() + ":" + std::to_string(number + 1) +
                            ": the line is longer than 64 MB; this is not a table of text"};
        buffer.resize(had + buffer_bytes);
        const std::size_t got = gzip.read(buffer.data() + had, buffer_bytes);
        buffer.resize(had + got);
        if (got == 0)
            ended = true;
        if (std::memchr(buffer.data() + had, 0, got) != nullptr)
            throw DataError{file.string() +
                            ": holds zero bytes, so it is not text in UTF-8; give a "
                            "text file, or record.layout = \"grid\" for NetCDF"};
        if (!opened && !buffer.empty()) {
            opened = true;
            if (buffer.compare(0, 2, "\xFF\xFE") == 0 || buffer.compare(0, 2, "\xFE\xFF") == 0)
                throw DataError{file.string() + ": is text in UTF-16; save it as UTF-8"};
            if (buffer.compare(0, 3, "\xEF\xBB\xBF") == 0)
                start = 3;
        }
        return got > 0;
    }
};

LineSource::LineSource(fs::path file) : m_data{std::make_unique<Data>(file)} {}
LineSource::LineSource(LineSource&&) noexcept = default;
LineSource& LineSource::operator=(LineSource&&) noexcept = default;
LineSource::~LineSource() = default;

bool LineSource::next(std::string_view& line) {
    Data& d = *m_data;
    std::size_t scanned = 0;
    for (;;) {
        const std::string_view rest = std::string_view{d.buffer}.substr(d.start);
        const std::size_t end = rest.find_first_of("\n\r", scanned);
        // A carriage return at the end of the buffer may be followed by its line feed.
        const bool sure = end != std::string_view::npos &&
                          (rest[end] == '\n' || end + 1 < rest.size() || d.ended);
        if (sure) {
            line = rest.substr(0, end);
            d.offset = d.consumed + d.start;
            d.start += end + 1;
            if (rest[end] == '\r' && end + 1 < rest.size() && rest[end + 1] == '\n')
                ++d.start;
            ++d.number;
            return true;
        }
        scanned = end == std::string_view::npos ? rest.size() : end;
        if (d.fill())
            continue;
        if (!d.ended)
            continue;
        const std::string_view last = std::string_view{d.buffer}.substr(d.start);
        if (last.empty())
            return false;
        if (last.find_first_of("\n\r") != std::string_view::npos)
            continue;
        line = last;
        d.offset = d.consumed + d.start;
        d.start = d.buffer.size();
        ++d.number;
        return true;
    }
}

std::size_t LineSource::number() const {
    return m_data->number;
}
std::size_t LineSource::offset() const {
    return m_data->offset;
}
const fs::path& LineSource::file() const {
    return m_data->file;
}

std::string read_text(const fs::path& file, std::size_t largest) {
    GzipFile gzip{file};
    std::string text;
    for (;;) {
        const std::size_t had = text.size();
        text.resize(had + buffer_bytes);
        const std::size_t got = gzip.read(text.data() + had, buffer_bytes);
        text.resize(had + got);
        if (got == 0)
            break;
        if (text.size() > largest)
            throw DataError{file.string() + ": is over " + std::to_string(largest >> 20U) +
                            " MB unpacked, too large for one trace; see record.layout"};
    }
    if (std::memchr(text.data(), 0, text.size()) != nullptr)
        throw DataError{file.string() +
                        ": holds zero bytes, so it is not text in UTF-8; give a text "
                        "file, or record.layout = \"grid\" for NetCDF"};
    if (text.compare(0, 3, "\xEF\xBB\xBF") == 0)
        text.erase(0, 3);
    return text;
}

std::string_view trim(std::string_view text) {
    while (!text.empty() && (text.front() == ' ' || text.front() == '\t' || text.front() == '\r'))
        text.remove_prefix(1);
    while (!text.empty() && (text.back() == ' ' || text.back() == '\t' || text.back() == '\r'))
        text.remove_suffix(1);
    return text;
}

void split_cells(std::string_view line, char delimiter, std::vector<std::string_view>& cells) {
    cells.clear();
    if (delimiter == ' ') {
        std::size_t at = 0;
        while (at < line.size()) {
            const std::size_t begin = line.find_first_not_of(" \t", at);
            if (begin == std::string_view::npos)
                break;
            const std::size_t end = std::min(line.find_first_of(" \t", begin), line.size());
            cells.push_back(line.substr(begin, end - begin));
            at = end;
        }
        return;
    }
    std::size_t at = 0;
    for (;;) {
        std::size_t end = line.find(delimiter, at);
        const std::size_t quote = line.find_first_not_of(" \t", at);
        if (quote != std::string_view::npos && quote < end && line[quote] == '"') {
            const std::size_t close = line.find('"', quote + 1);
            if (close != std::string_view::npos) {
                end = line.find(delimiter, close);
                cells.push_back(line.substr(quote + 1, close - quote - 1));
                if (end == std::string_view::npos)
                    return;
                at = end + 1;
                continue;
            }
        }
        if (end == std::string_view::npos) {
            cells.push_back(trim(line.substr(at)));
            return;
        }
        cells.push_back(trim(line.substr(at, end - at)));
        at = end + 1;
    }
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "record/find_files.hpp"

#include "base/error.hpp"

#include <algorithm>
#include <optional>
#include <set>

namespace fs = std::filesystem;

namespace rillstrand::record {

namespace {

constexpr std::size_t most_files = 10000000;

/// One bracket expression, `[a-z]` or `[!a-z]`.
/// @param at  index behind the opening bracket; moved behind the closing one
/// @return whether c is in it; nothing if it is not closed and so stands for itself
std::optional<bool> in_brackets(std::string_view pattern, std::size_t& at, char c) {
    std::size_t i = at;
    const bool negated = i < pattern.size() && (pattern[i] == '!' || pattern[i] == '^');
    if (negated)
        ++i;
    bool found = false;
    for (std::size_t first = i; i < pattern.size(); ++i) {
        if (pattern[i] == ']' && i > first) {
            at = i + 1;
            return found != negated;
        }
        if (i + 2 < pattern.size() && pattern[i + 1] == '-' && pattern[i + 2] != ']') {
            found = found || (pattern[i] <= c && c <= pattern[i + 2]);
            i += 2;
        } else {
            found = found || pattern[i] == c;
        }
    }
    return std::nullopt;
}

bool has_wildcard(const std::string& part) {
    return part.find_first_of("*?[") != std::string::npos;
}

/// A Zarr store is a folder that stands for a file.
bool is_store(const fs::path& folder) {
    std::error_code ignored;
    return fs::exists(folder / ".zgroup", ignored) || fs::exists(folder / ".zarray", ignored) ||
           fs::exists(folder / "zarr.json", ignored);
}

class Finder {
public:
    explicit Finder(std::vector<std::string> parts) : m_parts{std::move(parts)} {}

    void walk(const fs::path& folder, std::size_t depth, std::set<fs::path>& found) const {
        const std::string& part = m_parts[depth];
        const bool last = depth + 1 == m_parts.size();
        std::error_code error;
        // A name that is there as it stands wins: files may be called `a[1].csv`.
        const bool literal = !has_wildcard(part) || fs::exists(folder / part, error);
        if (literal) {
            const fs::path path = folder / part;
            if (last && fs::exists(path, error))
                found.insert(path.lexically_normal());
            else if (!last && fs::is_directory(path, error))
                walk(path, depth + 1, found);
            return;
        }
        for (fs::directory_iterator it{folder, error}, end; !error && it != end;
             it.increment(error)) {
            if (!matches(it->path().filename().string(), part))
                continue;
            const bool is_folder = it->is_directory(error);
            if (!last && is_folder)
                walk(it->path(), depth + 1, found);
            else if (last && (!is_folder || is_store(it->path())))
                found.insert(it->path().lexically_normal());
            if (found.size() > most_files)
                throw DataError{"record.files: '" + part +
                                "' matches over 10000000 files; narrow the pattern"};
        }
    }

private:
    std::vector<std::string> m_parts;
};

} // namespace

bool matches(std::string_view name, std::string_view pattern) {
    // A leading dot is matched by a dot only, as in a shell.
    if (!name.empty() && name.front() == '.' && (pattern.empty() || pattern.front() != '.'))
        return false;
    std::size_t n = 0, p = 0;
    std::size_t star_n = 0, star_p = std::string_view::npos;
    while (n < name.size()) {
        std::size_t after = p + 1;
        bool fits = false;
        if (p < pattern.size() && pattern[p] == '*') {
            star_p = p++;
            star_n = n;
            continue;
        }
        if (p < pattern.size()) {
            fits = pattern[p] == '?' || pattern[p] == name[n];
            if (pattern[p] == '[') {
                std::size_t close = p + 1;
                if (const auto in = in_brackets(pattern, close, name[n])) {
                    fits = *in;
                    after = close;
                }
            }
        }
        if (fits) {
            ++n;
            p = after;
        } else if (star_p != std::string_view::npos) {
            p = star_p + 1;
            n = ++star_n;
        } else {
            return false;
        }
    }
    return pattern.substr(std::min(p, pattern.size())).find_first_not_of('*') ==
           std::string_view::npos;
}

std::vector<fs::path> find_files(const std::vector<std::string>& patterns, const fs::path& folder) {
    std::set<fs::path> found;
    Problems problems;
    for (const auto& pattern : patterns) {
        const fs::path path{pattern};
        std::vector<std::string> parts;
        for (const auto& part : path.relative_path())
            if (!part.empty())
                parts.push_back(part.string());
        std::set<fs::path> here;
        if (!parts.empty())
            Finder{parts}.walk(path.is_absolute() ? path.root_path() : folder, 0, here);
        if (here.empty())
            problems.add("record.files: '" + pattern + "' matches no file in " + folder.string() +
                         "; correct the pattern or put the files there");
        found.merge(here);
    }
    problems.throw_if_any();
    return {found.begin(), found.end()};
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "output.hpp"

#include "base/error.hpp"

#include <fcntl.h>
#include <sys/file.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <fstream>
#include <system_error>

namespace fs = std::filesystem;

namespace rillstrand::app {

namespace {

constexpr const char* staging_prefix = ".rillstrand-staging-";
constexpr const char* pending_name = ".rillstrand-pending";

std::string reason() {
    return std::strerror(errno);
}

/// Flushes a file or folder to disk, so that a rename never outlives the bytes it names.
void flush(const fs::path& path, bool folder) {
    const int fd = ::open(path.c_str(), folder ? O_RDONLY | O_DIRECTORY : O_RDONLY);
    if (fd < 0)
        throw MachineError{path.string() + ": cannot be opened to flush it: " + reason()};
    const int failed = ::fsync(fd);
    const std::string why = reason();
    ::close(fd);
    if (failed != 0)
        throw MachineError{path.string() + ": cannot be flushed to disk: " + why};
}

std::vector<fs::path> files_below(const fs::path& folder) {
    std::vector<fs::path> names;
    for (const auto& entry : fs::recursive_directory_iterator{folder})
        if (entry.is_regular_file())
            names.push_back(fs::relative(entry.path(), folder));
    std::sort(names.begin(), names.end());
    return names;
}

/// A subfolder of the output must be a real folder: a link could lead the files elsewhere.
void make_folder(const fs::path& base, const fs::path& relative) {
    fs::path at = base;
    for (const auto& part : relative) {
        at /= part;
        const fs::file_status status = fs::symlink_status(at);
        if (status.type() == fs::file_type::symlink)
            throw DataError{at.string() + ": is a symbolic link; rillstrand writes only inside its "
                                          "output folder, remove the link"};
        if (fs::exists(status) && !fs::is_directory(status))
            throw DataError{at.string() + ": is a file where a folder is needed; move it away"};
        std::error_code error;
        fs::create_directory(at, error);
        if (error)
            throw MachineError{at.string() + ": cannot be made: " + error.message()};
    }
}

void put_in_place(const fs::path& staging, const fs::path& folder,
                  const std::vector<fs::path>& names) {
    for (const auto& name : names) {
        if (!fs::exists(staging / name))
            continue; // already moved before a kill
        make_folder(folder, name.parent_path());
        if (fs::is_directory(fs::symlink_status(folder / name)))
            throw DataError{(folder / name).string() +
                            ": is a folder where a file is to be written; move it away"};
        if (::rename((staging / name).c_str(), (folder / name).c_str()) != 0)
            throw MachineError{(folder / name).string() + ": cannot be replaced: " + reason()};
    }
    flush(folder, true);
}

void write_file(const fs::path& path, const std::string& content) {
    std::ofstream file{path, std::ios::binary};
    file.write(content.data(), static_cast<std::streamsize>(content.size()));
    file.close();
    if (!file)
        throw MachineError{path.string() + ": cannot be written: " + reason() +
                           "; free some space or choose another output folder"};
}

} // namespace

Output::Output(fs::path folder) : m_folder{std::move(folder)} {
    std::error_code error;
    if (fs::exists(m_folder, error) && !fs::is_directory(m_folder))
        throw DataError{m_folder.string() + ": is not a folder; name a folder in campaign.output"};
    fs::create_directories(m_folder, error);
    if (error)
        throw MachineError{m_folder.string() +
                           ": output folder cannot be made: " + error.message() +
                           "; name a folder that you may write in campaign.output"};
    m_lock = ::open(m_folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (m_lock < 0 || ::flock(m_lock, LOCK_EX | LOCK_NB) != 0) {
        const bool busy = m_lock >= 0 && errno == EWOULDBLOCK;
        const std::string why = reason();
        if (m_lock >= 0)
            ::close(m_lock);
        if (busy)
            throw DataError{m_folder.string() + ": another run is writing into this folder; wait "
                                                "for it or name another folder in campaign.output"};
        throw MachineError{m_folder.string() + ": output folder cannot be opened: " + why};
    }
    try {
        carry_out_pending();
        clear_left_over();
        std::string pattern = (m_folder / (std::string{staging_prefix} + "XXXXXX")).string();
        if (::mkdtemp(pattern.data()) == nullptr)
            throw MachineError{m_folder.string() + ": output folder cannot be written: " +
                               reason() + "; name a folder that you may write in campaign.output"};
        m_staging = pattern;
    } catch (...) {
        ::close(m_lock);
        throw;
    }
}

Output::~Output() {
    std::error_code ignored;
    if (!m_staging.empty())
        fs::remove_all(m_staging, ignored);
    if (m_lock >= 0)
        ::close(m_lock);
}

void Output::write(const fs::path& name, const std::string& content) const {
    std::error_code error;
    fs::create_directories((m_staging / name).parent_path(), error);
    if (error)
        throw MachineError{name.string() + ": cannot be written: " + error.message()};
    write_file(m_staging / name, content);
}

std::vector<fs::path> Output::commit() {
    if (!fs::is_directory(m_staging))
        throw MachineError{m_folder.string() +
                           ": the output folder was removed during the run; run again"};
    std::vector<fs::path> names = files_below(m_staging);
    for (const auto& name : names)
        flush(m_staging / name, false);
    std::string list = m_staging.filename().string() + "\n";
    for (const auto& name : names)
        list += name.string() + "\n";
    const fs::path pending = m_folder / pending_name;
    const fs::path draft = m_staging / pending_name;
    write_file(draft, list + ".\n");
    flush(draft, false);
    flush(m_staging, true);
    if (::rename(draft.c_str(), pending.c_str()) != 0)
        throw MachineError{pending.string() + ": cannot be written: " + reason()};
    flush(m_folder, true);
    put_in_place(m_staging, m_folder, names);
    std::error_code ignored;
    fs::remove(pending, ignored);
    fs::remove_all(m_staging, ignored);
    m_staging.clear();
    return names;
}

void Output::carry_out_pending() const {
    const fs::path pending = m_folder / pending_name;
    if (!fs::is_regular_file(fs::symlink_status(pending)))
        return;
    std::ifstream file{pending};
    std::string staging;
    std::getline(file, staging);
    std::vector<fs::path> names;
    bool whole = false;
    for (std::string line; std::getline(file, line);) {
        if (line == ".")
            whole = true;
        else
            names.emplace_back(line);
    }
    const fs::path folder = m_folder / fs::path{staging}.filename();
    if (whole && staging.rfind(staging_prefix, 0) == 0 && fs::is_directory(folder)) {
        const bool inside = std::all_of(names.begin(), names.end(), [](const fs::path& name) {
            return name.is_relative() && name.lexically_normal().string().rfind("..", 0) != 0;
        });
        if (inside)
            put_in_place(folder, m_folder, names);
    }
    std::error_code ignored;
    fs::remove(pending, ignored);
}

void Output::clear_left_over() const {
    std::error_code ignored;
    for (const auto& entry : fs::directory_iterator{m_folder, ignored})
        if (entry.path().filename().string().rfind(staging_prefix, 0) == 0 && !entry.is_symlink())
            fs::remove_all(entry.path(), ignored);
}

} // namespace rillstrand::app

// SPDX-License-Identifier: Apache-2.0
#include "record/scratch_file.hpp"

#include "base/error.hpp"

#include <unistd.h>

#include <cerrno>
#include <cstdlib>
#include <cstring>

namespace rillstrand::record {

ScratchFile::ScratchFile(const std::filesystem::path& folder) : m_folder{folder} {
    std::string name = (folder / ".gathering-XXXXXX").string();
    m_fd = ::mkstemp(name.data());
    if (m_fd < 0)
        throw MachineError{folder.string() + ": no temporary file can be made here (" +
                           std::strerror(errno) + "); free some space or mend the rights"};
    ::unlink(name.c_str());
}

ScratchFile::~ScratchFile() {
    ::close(m_fd);
}

std::uint64_t ScratchFile::append(const void* from, std::size_t count) {
    const std::uint64_t begin = m_size;
    const char* at = static_cast<const char*>(from);
    while (count > 0) {
        const ssize_t got = ::pwrite(m_fd, at, count, static_cast<off_t>(m_size));
        if (got < 0 && errno == EINTR)
            continue;
        if (got <= 0)
            throw MachineError{m_folder.string() + ": a temporary file cannot be written (" +
                               std::strerror(errno) + "); free some space"};
        at += got;
        count -= static_cast<std::size_t>(got);
        m_size += static_cast<std::uint64_t>(got);
    }
    return begin;
}

void ScratchFile::read(std::uint64_t offset, void* to, std::size_t count) const {
    if (read_at(m_fd, offset, to, count) != static_cast<std::int64_t>(count))
        throw MachineError{m_folder.string() +
                           ": a temporary file cannot be read back; check the disk"};
}

std::int64_t read_at(int fd, std::uint64_t offset, void* to, std::size_t count) {
    char* at = static_cast<char*>(to);
    std::size_t filled = 0;
    while (filled < count) {
        const ssize_t got =
            ::pread(fd, at + filled, count - filled, static_cast<off_t>(offset + filled));
        if (got < 0 && errno == EINTR)
            continue;
        if (got < 0)
            return -1;
        if (got == 0)
            break;
        filled += static_cast<std::size_t>(got);
    }
    return static_cast<std::int64_t>(filled);
}

} // namespace rillstrand::record

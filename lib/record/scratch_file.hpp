// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstdint>
#include <filesystem>
#include <string>

namespace rillstrand::record {

/// A file without a name for what does not fit into memory: it is gone when the program ends,
/// however it ends.
class ScratchFile {
public:
    /// @throws MachineError if it cannot be made in the folder
    explicit ScratchFile(const std::filesystem::path& folder);
    ScratchFile(const ScratchFile&) = delete;
    ScratchFile& operator=(const ScratchFile&) = delete;
    ScratchFile(ScratchFile&&) = delete;
    ScratchFile& operator=(ScratchFile&&) = delete;
    ~ScratchFile();

    /// @return where the bytes begin
    /// @throws MachineError if there is no space
    std::uint64_t append(const void* from, std::size_t count);
    /// @throws MachineError if they cannot be read
    void read(std::uint64_t offset, void* to, std::size_t count) const;
    std::uint64_t size() const { return m_size; }

private:
    std::filesystem::path m_folder;
    int m_fd = -1;
    std::uint64_t m_size = 0;
};

/// Reads so many bytes of an open file, whatever signals come.
/// @return bytes read, fewer only at the end of the file; negative on failure (see errno)
std::int64_t read_at(int fd, std::uint64_t offset, void* to, std::size_t count);

} // namespace rillstrand::record

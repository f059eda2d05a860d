// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <filesystem>
#include <memory>

namespace rillstrand::record {

/// Bytes of a file, unpacked where it is gzip: told from its first bytes, never from its name.
///
/// Refused by name: what is no plain file (a folder, a pipe, a device), a stream that is cut short
/// or damaged, bytes behind a stream that are no further stream, and a stream that unpacks to more
/// than 256 MiB and 300 times its size, as no table of measured numbers does (a made-up bomb; limit
/// chosen from measured tables, which pack 3 to 20 times).
class ByteSource {
public:
    /// @throws DataError if the file cannot be opened
    explicit ByteSource(const std::filesystem::path& file);
    ByteSource(const ByteSource&) = delete;
    ByteSource& operator=(const ByteSource&) = delete;
    ByteSource(ByteSource&&) noexcept;
    ByteSource& operator=(ByteSource&&) noexcept;
    ~ByteSource();

    /// Fills up to `count` bytes.
    /// @return bytes filled, fewer than `count` only at the end of the file
    /// @throws DataError if the file cannot be read on
    std::size_t read(char* to, std::size_t count);
    bool packed() const;
    /// Bytes of the file as it lies on the disk, and how many of them have been read.
    std::uint64_t size() const;
    std::uint64_t taken() const;

private:
    struct Data;
    std::unique_ptr<Data> m_data;
};

} // namespace rillstrand::record

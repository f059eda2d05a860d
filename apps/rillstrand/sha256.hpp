// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <filesystem>
#include <string>

namespace rillstrand::app {

/// SHA-256 of a file's bytes as 64 hexadecimal digits (FIPS 180-4, by OpenSSL). A folder (a Zarr
/// store) gives the digest of its files' names and digests in order of name.
/// @throws DataError if it cannot be read
std::string sha256_of(const std::filesystem::path& path);

} // namespace rillstrand::app

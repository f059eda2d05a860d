// SPDX-License-Identifier: Apache-2.0
#include "sha256.hpp"

#include "base/error.hpp"

#include <openssl/evp.h>

#include <algorithm>
#include <array>
#include <fstream>
#include <memory>
#include <vector>

namespace fs = std::filesystem;

namespace rillstrand::app {

namespace {

class Digest {
public:
    Digest() : m_context{EVP_MD_CTX_new(), &EVP_MD_CTX_free} {
        EVP_DigestInit_ex(m_context.get(), EVP_sha256(), nullptr);
    }
    void add(const char* bytes, std::size_t count) {
        EVP_DigestUpdate(m_context.get(), bytes, count);
    }
    std::string hex() {
        std::array<unsigned char, EVP_MAX_MD_SIZE> raw{};
        unsigned size = 0;
        EVP_DigestFinal_ex(m_context.get(), raw.data(), &size);
        std::string text;
        for (unsigned i = 0; i < size; ++i) {
            constexpr const char* digits = "0123456789abcdef";
            text += digits[raw[i] >> 4U];
            text += digits[raw[i] & 15U];
        }
        return text;
    }

private:
    std::unique_ptr<EVP_MD_CTX, decltype(&EVP_MD_CTX_free)> m_context;
};

std::string sha256_of_file(const fs::path& path) {
    std::ifstream file{path, std::ios::binary};
    if (!file)
        throw DataError{path.string() + ": cannot be read; check the path and the rights"};
    Digest digest;
    std::vector<char> buffer(1U << 20U);
    while (file) {
        file.read(buffer.data(), static_cast<std::streamsize>(buffer.size()));
        digest.add(buffer.data(), static_cast<std::size_t>(file.gcount()));
    }
    return digest.hex();
}

} // namespace

std::string sha256_of(const fs::path& path) {
    if (!fs::is_directory(path))
        return sha256_of_file(path);
    std::vector<fs::path> names;
    for (const auto& entry : fs::recursive_directory_iterator{path})
        if (entry.is_regular_file())
            names.push_back(fs::relative(entry.path(), path));
    std::sort(names.begin(), names.end());
    Digest digest;
    for (const auto& name : names) {
        const std::string line = name.generic_string() + " " + sha256_of_file(path / name) + "\n";
        digest.add(line.data(), line.size());
    }
    return digest.hex();
}

} // namespace rillstrand::app

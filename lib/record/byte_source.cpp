// SPDX-License-Identifier: Apache-2.0
#include "record/byte_source.hpp"

#include "base/error.hpp"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>
#include <zlib.h>

#include <algorithm>
#include <array>
#include <cerrno>
#include <cstring>
#include <limits>
#include <string>
#include <vector>

namespace rillstrand::record {

namespace {

constexpr std::size_t input_bytes = std::size_t{64} << 10U;
constexpr std::uint64_t bomb_bytes = std::uint64_t{256} << 20U;
constexpr std::uint64_t bomb_ratio = 300;
constexpr unsigned char magic_first = 0x1F;
constexpr unsigned char magic_second = 0x8B;

} // namespace

struct ByteSource::Data {
    std::string name;
    int fd = -1;
    std::uint64_t size = 0;
    std::uint64_t taken = 0;
    std::uint64_t given = 0;
    bool packed = false;
    bool in_stream = false; ///< inside a gzip stream, not between two
    bool inflating = false; ///< `z` is to be ended
    z_stream z{};
    std::vector<unsigned char> input;

    explicit Data(const std::filesystem::path& file) : name{file.string()} {
        fd = ::open(file.c_str(), O_RDONLY | O_CLOEXEC | O_NONBLOCK);
        if (fd < 0)
            refuse_opening(errno);
        struct stat about {};
        if (::fstat(fd, &about) != 0)
            refuse_opening(errno);
        if (S_ISDIR(about.st_mode))
            give_up(": is a folder where a text file is needed; name the files in it");
        if (!S_ISREG(about.st_mode))
            give_up(": is no plain file (a pipe or a device); copy its content into a file");
        size = static_cast<std::uint64_t>(about.st_size);
        look_for_gzip();
    }
    Data(const Data&) = delete;
    Data& operator=(const Data&) = delete;
    Data(Data&&) = delete;
    Data& operator=(Data&&) = delete;
    ~Data() { close(); }

    void close() {
        if (inflating)
            ::inflateEnd(&z);
        inflating = false;
        if (fd >= 0)
            ::close(fd);
        fd = -1;
    }

    [[noreturn]] void give_up(const std::string& what) {
        close(); // the destructor does not run for an object that was never finished
        throw DataError{name + what};
    }

    [[noreturn]] void refuse_opening(int code) {
        if (code == ENOENT || code == ENOTDIR)
            give_up(": there is no such file; correct the name");
        give_up(": cannot be opened (" + std::string{std::strerror(code)} + "); check the rights");
    }

    void look_for_gzip() {
        std::array<unsigned char, 2> head{};
        const ssize_t got = ::pread(fd, head.data(), head.size(), 0);
        packed = got == 2 && head[0] == magic_first && head[1] == magic_second;
        if (!packed)
            return;
        input.resize(input_bytes);
        constexpr int gzip_only = 16;
        if (::inflateInit2(&z, MAX_WBITS + gzip_only) != Z_OK)
            throw MachineError{name + ": there is no memory to unpack it"};
        inflating = true;
        in_stream = true;
    }

    std::size_t take(void* to, std::size_t count) {
        for (;;) {
            const ssize_t got = ::read(fd, to, count);
            if (got >= 0) {
                taken += static_cast<std::uint64_t>(got);
                return static_cast<std::size_t>(got);
            }
            if (errno != EINTR)
                give_up(": cannot be read (" + std::string{std::strerror(errno)} +
                        "); copy the file again");
        }
    }

    /// @return false at the end of the file
    bool more_input() {
        if (z.avail_in > 0)
            return true;
        z.next_in = input.data();
        z.avail_in = static_cast<uInt>(take(input.data(), input.size()));
        return z.avail_in > 0;
    }

    /// Between two streams: padding zeros are passed over, a further stream is begun.
    bool next_stream() {
        while (more_input() && *z.next_in == 0) {
            ++z.next_in;
            --z.avail_in;
        }
        if (z.avail_in == 0)
            return false;
        if (*z.next_in != magic_first)
            give_up(": bytes that are no gzip follow the gzip stream; copy the file again");
        ::inflateReset(&z);
        in_stream = true;
        return true;
    }

    std::size_t unpack(char* to, std::size_t count) {
        z.next_out = reinterpret_cast<Bytef*>(to);
        z.avail_out = static_cast<uInt>(count);
        while (z.avail_out > 0) {
            if (!in_stream && !next_stream())
                break;
            if (!more_input())
                give_up(": the gzip stream is cut short; copy the file again");
            const int code = ::inflate(&z, Z_NO_FLUSH);
            if (code == Z_STREAM_END)
                in_stream = false;
            else if (code == Z_MEM_ERROR)
                throw MachineError{name + ": there is no memory to unpack it"};
            else if (code != Z_OK && code != Z_BUF_ERROR)
                give_up(": the gzip stream is damaged (" +
                        std::string{z.msg != nullptr ? z.msg : "wrong bytes"} +
                        "); copy the file again");
        }
        const std::size_t got = count - z.avail_out;
        given += got;
        if (given > bomb_bytes && given / bomb_ratio > taken)
            give_up(": unpacks to more than 300 times its size, as no table of measured numbers "
                    "does; check what the file is");
        return got;
    }
};

ByteSource::ByteSource(const std::filesystem::path& file) : m_data{std::make_unique<Data>(file)} {}
ByteSource::ByteSource(ByteSource&&) noexcept = default;
ByteSource& ByteSource::operator=(ByteSource&&) noexcept = default;
ByteSource::~ByteSource() = default;

std::size_t ByteSource::read(char* to, std::size_t count) {
    count = std::min<std::size_t>(count, std::numeric_limits<uInt>::max() / 2);
    if (m_data->packed)
        return m_data->unpack(to, count);
    std::size_t filled = 0;
    while (filled < count) {
        const std::size_t got = m_data->take(to + filled, count - filled);
        if (got == 0)
            break;
        filled += got;
    }
    return filled;
}

bool ByteSource::packed() const {
    return m_data->packed;
}
std::uint64_t ByteSource::size() const {
    return m_data->size;
}
std::uint64_t ByteSource::taken() const {
    return m_data->taken;
}

} // namespace rillstrand::record

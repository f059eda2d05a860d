// SPDX-License-Identifier: Apache-2.0
#include "layers_write.hpp"

#include "base/error.hpp"

#include <array>
#include <cerrno>
#include <cstdio>
#include <memory>
#include <system_error>

namespace rillstrand::geo::writing {

namespace {
[[noreturn]] void cannot_write(const std::filesystem::path& file, int reason) {
    throw MachineError{file.string() + ": cannot be written (" +
                       std::generic_category().message(reason) +
                       "); make room on the disk or choose an output folder that can be written"};
}

struct CloseFile {
    void operator()(std::FILE* handle) const {
        (void)std::fclose(handle); // only after a failure that is told already
    }
};

/// Length of the well-formed UTF-8 sequence that begins here, 0 where it is none.
/// Source: Unicode 15, table 3-7.
std::size_t sequence_length(std::string_view text) {
    const auto byte = [&](std::size_t i) {
        return i < text.size() ? static_cast<unsigned char>(text[i]) : 0U;
    };
    const auto in = [&](std::size_t i, unsigned from, unsigned to) {
        return byte(i) >= from && byte(i) <= to;
    };
    const auto tail = [&](std::size_t i) { return in(i, 0x80, 0xBF); };
    if (byte(0) < 0x80)
        return 1;
    if (in(0, 0xC2, 0xDF))
        return tail(1) ? 2 : 0;
    const unsigned low = byte(0) == 0xE0 ? 0xA0U : byte(0) == 0xF0 ? 0x90U : 0x80U;
    const unsigned high = byte(0) == 0xED ? 0x9FU : byte(0) == 0xF4 ? 0x8FU : 0xBFU;
    if (in(0, 0xE0, 0xEF))
        return in(1, low, high) && tail(2) ? 3 : 0;
    if (in(0, 0xF0, 0xF4))
        return in(1, low, high) && tail(2) && tail(3) ? 4 : 0;
    return 0;
}
} // namespace

void write_pieces(const std::filesystem::path& file,
                  const std::function<void(const std::function<void(std::string&)>&)>& fill) {
    std::unique_ptr<std::FILE, CloseFile> out{std::fopen(file.c_str(), "wb")};
    if (!out)
        cannot_write(file, errno);
    fill([&](std::string& piece) {
        if (std::fwrite(piece.data(), 1, piece.size(), out.get()) != piece.size())
            cannot_write(file, errno);
        piece.clear();
    });
    if (std::fclose(out.release()) != 0)
        cannot_write(file, errno);
}

void write_text(const std::filesystem::path& file, std::string text) {
    write_pieces(file, [&](const std::function<void(std::string&)>& next) { next(text); });
}

std::string joined(std::initializer_list<std::string_view> pieces) {
    std::string text;
    for (const auto piece : pieces)
        text += piece;
    return text;
}

std::string utf8(std::string_view text) {
    std::string result;
    result.reserve(text.size());
    while (!text.empty()) {
        const std::size_t length = sequence_length(text);
        if (length == 0)
            result += "\xEF\xBF\xBD"; // the replacement character
        else
            result += text.substr(0, length);
        text.remove_prefix(length == 0 ? 1 : length);
    }
    return result;
}

std::string xml(std::string_view text) {
    std::string result;
    result.reserve(text.size());
    for (const char c : utf8(text)) {
        switch (c) {
        case '&':
            result += "&amp;";
            break;
        case '<':
            result += "&lt;";
            break;
        case '>':
            result += "&gt;";
            break;
        case '"':
            result += "&quot;";
            break;
        case '\'':
            result += "&apos;";
            break;
        default:
            // XML 1.0 has no other control characters, not even escaped ones.
            if (static_cast<unsigned char>(c) >= 0x20 || c == '\n' || c == '\t')
                result += c;
        }
    }
    return result;
}

std::string json(std::string_view text) {
    std::string result = "\"";
    result.reserve(text.size() + 2);
    for (const char c : utf8(text)) {
        if (c == '"' || c == '\\') {
            result += '\\';
            result += c;
        } else if (static_cast<unsigned char>(c) < 0x20) {
            std::array<char, 8> buffer{};
            std::snprintf(buffer.data(), buffer.size(), "\\u%04x", static_cast<unsigned>(c));
            result += buffer.data();
        } else {
            result += c;
        }
    }
    return result + '"';
}

} // namespace rillstrand::geo::writing

// SPDX-License-Identifier: Apache-2.0
#include "page.hpp"

#include "page_parts.hpp"

#include <cstdint>
#include <utility>
#include <vector>

namespace rillstrand::page {

namespace {

/// JSON inside a script element: `<` never stands in it, so neither `</script>` nor `<!--` can.
std::string for_script(const std::string& json) {
    std::string safe;
    safe.reserve(json.size());
    for (const char c : json) {
        if (c == '<')
            safe += "\\u003c";
        else if (c == '>')
            safe += "\\u003e";
        else if (c == '&')
            safe += "\\u0026";
        else
            safe += c;
    }
    return safe;
}

/// Puts texts in place of their marks in one pass: nothing that was put in is taken for a mark.
std::string filled(const std::string& form,
                   const std::vector<std::pair<std::string, std::string>>& texts) {
    std::string out;
    std::size_t at = 0;
    for (const auto& [mark, text] : texts) {
        const std::size_t found = form.find(mark, at);
        if (found == std::string::npos)
            continue;
        out.append(form, at, found - at).append(text);
        at = found + mark.size();
    }
    return out.append(form, at);
}

} // namespace

std::string escape_html(const std::string& text) {
    std::string safe;
    for (const char c : text) {
        switch (c) {
        case '&':
            safe += "&amp;";
            break;
        case '<':
            safe += "&lt;";
            break;
        case '>':
            safe += "&gt;";
            break;
        case '"':
            safe += "&quot;";
            break;
        case '\'':
            safe += "&#39;";
            break;
        default:
            safe += c;
        }
    }
    return safe;
}

std::string base64(const std::string& bytes) {
    constexpr const char* digits =
        "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    std::string text;
    text.reserve((bytes.size() + 2) / 3 * 4);
    for (std::size_t i = 0; i < bytes.size(); i += 3) {
        std::uint32_t group = 0;
        for (std::size_t k = 0; k < 3; ++k)
            group = group << 8U |
                    (i + k < bytes.size() ? static_cast<unsigned char>(bytes[i + k]) : 0U);
        for (std::size_t k = 0; k < 4; ++k)
            text += i + k > bytes.size() ? '=' : digits[group >> (18U - 6U * k) & 63U];
    }
    return text;
}

std::string render(const std::string& title, const std::string& data_json) {
    return filled(page_html, {{"{{title}}", escape_html(title)},
                              {"{{style}}", page_css},
                              {"{{data}}", for_script(data_json)},
                              {"{{script}}", page_js}});
}

} // namespace rillstrand::page

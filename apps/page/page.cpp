// SPDX-License-Identifier: Apache-2.0
#include "page.hpp"

#include "page_parts.hpp"

#include <cstdint>

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

void replace(std::string& text, const std::string& mark, const std::string& with) {
    const std::size_t at = text.find(mark);
    if (at != std::string::npos)
        text.replace(at, mark.size(), with);
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
    std::string html = page_html;
    // The data go in last: nothing in them is taken for a mark.
    replace(html, "{{style}}", page_css);
    replace(html, "{{script}}", page_js);
    replace(html, "{{title}}", escape_html(title));
    replace(html, "{{data}}", for_script(data_json));
    return html;
}

} // namespace rillstrand::page

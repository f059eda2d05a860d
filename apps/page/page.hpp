// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>

/// The page that people look at: one self-contained HTML text that asks nobody for anything.
namespace rillstrand::page {

/// @param title      of the campaign, any text
/// @param data_json  JSON of what the page shows; it is embedded so that no text in it is markup
std::string render(const std::string& title, const std::string& data_json);

/// RFC 4648, with padding.
std::string base64(const std::string& bytes);

/// Text for HTML: `&`, `<`, `>`, `"` and `'` as entities.
std::string escape_html(const std::string& text);

} // namespace rillstrand::page

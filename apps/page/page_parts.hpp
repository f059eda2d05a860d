// SPDX-License-Identifier: Apache-2.0
#pragma once

namespace rillstrand::page {

extern const char* const page_html; ///< with the marks {{style}}, {{script}}, {{title}}, {{data}}
extern const char* const page_css;
extern const char* const page_js;

} // namespace rillstrand::page

// SPDX-License-Identifier: Apache-2.0
#include "base/error.hpp"

namespace rillstrand {

namespace {
std::string joined(const std::vector<std::string>& problems) {
    std::string text;
    for (const auto& problem : problems) {
        if (!text.empty())
            text += '\n';
        text += problem;
    }
    return text;
}
} // namespace

DataError::DataError(const std::string& problem) : Error{problem}, m_problems{problem} {}

DataError::DataError(std::vector<std::string> problems)
    : Error{joined(problems)}, m_problems{std::move(problems)} {}

void Problems::add(const DataError& error) {
    m_list.insert(m_list.end(), error.problems().begin(), error.problems().end());
}

void Problems::throw_if_any() const {
    if (!m_list.empty())
        throw DataError{m_list};
}

} // namespace rillstrand

// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <stdexcept>
#include <string>
#include <vector>

namespace rillstrand {

/// Anything that ends a run with a message for the person in the field.
class Error : public std::runtime_error {
public:
    using std::runtime_error::runtime_error;
};

/// Wrong words on the command line (exit status 2).
class UsageError : public Error {
public:
    using Error::Error;
};

/// Input that cannot be used (exit status 1): one sentence a problem, each with the file, the line
/// or the position, what is wrong and what would mend it.
class DataError : public Error {
public:
    explicit DataError(const std::string& problem);
    explicit DataError(std::vector<std::string> problems);
    const std::vector<std::string>& problems() const { return m_problems; }

private:
    std::vector<std::string> m_problems;
};

/// The machine failed (exit status 3): no space, no memory, a file that cannot be written.
class MachineError : public Error {
public:
    using Error::Error;
};

/// Problems of one input, collected so that they are told together and not one a run.
class Problems {
public:
    void add(std::string problem) { m_list.push_back(std::move(problem)); }
    void add(const DataError& error);
    bool empty() const { return m_list.empty(); }
    const std::vector<std::string>& list() const { return m_list; }
    /// @throws DataError with all problems, if there are any
    void throw_if_any() const;

private:
    std::vector<std::string> m_list;
};

/// A remark that does not stop the run; it goes to standard error and to the findings.
struct Warning {
    std::string code; ///< stable, lower case with hyphens, e.g. `record-gap`
    std::string text; ///< one sentence: where, what was found with unit, what to do
};
using Warnings = std::vector<Warning>;

} // namespace rillstrand

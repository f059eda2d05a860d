// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>

namespace rillstrand {

/// How far the work has come, for whoever watches. Both calls may throw to stop the work (the
/// user pressed Ctrl-C); `advance` may be called from several threads at once.
class Progress {
public:
    Progress() = default;
    Progress(const Progress&) = delete;
    Progress& operator=(const Progress&) = delete;
    Progress(Progress&&) = delete;
    Progress& operator=(Progress&&) = delete;
    virtual ~Progress() = default;
    /// A new stage begins.
    /// @param name         in words, e.g. `reading traces`
    /// @param total_units  amount of work in `unit`, 0 where it is not known
    /// @param unit         what is counted, e.g. `traces`, `channels`, `MB`
    virtual void stage(const std::string& name, double total_units, const std::string& unit) = 0;
    /// So many more units are done.
    virtual void advance(double units) = 0;
};

/// Nobody watches.
class NoProgress final : public Progress {
public:
    void stage(const std::string&, double, const std::string&) override {}
    void advance(double) override {}
};

} // namespace rillstrand

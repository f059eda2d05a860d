// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "base/progress.hpp"

#include <chrono>
#include <functional>
#include <mutex>
#include <ostream>
#include <stdexcept>
#include <string>

namespace rillstrand::app {

/// Thrown by Progress::advance when the user asked to stop; ends the run with status 130.
class Interrupted : public std::runtime_error {
public:
    Interrupted() : std::runtime_error{"stopped by the user; earlier output is as it was"} {}
};

enum class ProgressStyle {
    quiet, ///< nothing
    lines, ///< one line a stage
    bar    ///< a bar with rate and time left, redrawn in place
};

/// Progress on a stream, from any thread.
class TerminalProgress final : public Progress {
public:
    /// @param stopped  asked now and then; true ends the work with Interrupted
    TerminalProgress(std::ostream& stream, ProgressStyle style, std::function<bool()> stopped);
    ~TerminalProgress() override;
    TerminalProgress(const TerminalProgress&) = delete;
    TerminalProgress& operator=(const TerminalProgress&) = delete;
    TerminalProgress(TerminalProgress&&) = delete;
    TerminalProgress& operator=(TerminalProgress&&) = delete;
    void stage(const std::string& name, double total_units, const std::string& unit) override;
    void advance(double units) override;
    /// Ends the line of a bar, so that other text starts on a line of its own.
    void end_line();

private:
    using Clock = std::chrono::steady_clock;
    void draw(Clock::time_point now);
    std::ostream& m_stream;
    ProgressStyle m_style;
    std::function<bool()> m_stopped;
    std::mutex m_mutex;
    std::string m_name;
    std::string m_unit;
    double m_total = 0.0;
    double m_done = 0.0;
    bool m_open = false;
    Clock::time_point m_start;
    Clock::time_point m_drawn;
};

} // namespace rillstrand::app

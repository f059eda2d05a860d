// SPDX-License-Identifier: Apache-2.0
#include "terminal_progress.hpp"

#include "base/text.hpp"

#include <algorithm>
#include <cmath>

namespace rillstrand::app {

namespace {

constexpr std::chrono::milliseconds redraw_every{100};

std::string clock_text(double seconds) {
    const auto whole = static_cast<long>(std::ceil(seconds));
    const std::string s = std::to_string(whole % 60);
    return std::to_string(whole / 60) + ":" + (s.size() < 2 ? "0" : "") + s;
}

std::string amount(double units) {
    return text::fixed(units, units < 10.0 ? 1 : 0);
}

} // namespace

TerminalProgress::TerminalProgress(std::ostream& stream, ProgressStyle style,
                                   std::function<bool()> stopped)
    : m_stream{stream}, m_style{style}, m_stopped{std::move(stopped)} {}

TerminalProgress::~TerminalProgress() {
    end_line();
}

void TerminalProgress::stage(const std::string& name, double total_units, const std::string& unit) {
    if (m_stopped())
        throw Interrupted{};
    end_line();
    const std::scoped_lock lock{m_mutex};
    m_name = name;
    m_unit = unit;
    m_total = total_units;
    m_done = 0.0;
    m_start = Clock::now();
    m_drawn = {};
    if (m_style == ProgressStyle::lines) {
        m_stream << name;
        if (total_units > 0.0)
            m_stream << " (" << text::fixed(total_units, 0) << ' ' << unit << ')';
        m_stream << std::endl;
    } else if (m_style == ProgressStyle::bar) {
        m_open = true;
        draw(m_start);
    }
}

void TerminalProgress::advance(double units) {
    if (m_stopped())
        throw Interrupted{};
    if (m_style != ProgressStyle::bar)
        return;
    const std::scoped_lock lock{m_mutex};
    m_done += units;
    const auto now = Clock::now();
    if (now - m_drawn >= redraw_every)
        draw(now);
}

void TerminalProgress::end_line() {
    const std::scoped_lock lock{m_mutex};
    if (!m_open)
        return;
    if (m_total > 0.0)
        m_done = m_total;
    draw(Clock::now());
    m_stream << std::endl;
    m_open = false;
}

void TerminalProgress::draw(Clock::time_point now) {
    m_drawn = now;
    const double elapsed_s = std::chrono::duration<double>(now - m_start).count();
    std::string line = "\r\033[K" + m_name;
    if (m_total > 0.0) {
        constexpr int width = 24;
        const double share = std::clamp(m_done / m_total, 0.0, 1.0);
        const int full = static_cast<int>(share * width);
        line += " [" + std::string(static_cast<std::size_t>(full), '=') +
                std::string(static_cast<std::size_t>(width - full), ' ') + "] " +
                text::fixed(100.0 * share, 0) + " %";
    }
    if (elapsed_s > 0.2 && m_done > 0.0) {
        const double rate = m_done / elapsed_s;
        line += "  " + amount(rate) + ' ' + m_unit + "/s";
        if (m_total > m_done)
            line += "  " + clock_text((m_total - m_done) / rate) + " left";
    }
    m_stream << line << std::flush;
}

} // namespace rillstrand::app

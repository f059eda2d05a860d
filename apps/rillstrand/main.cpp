// SPDX-License-Identifier: Apache-2.0
#include "commands.hpp"
#include "terminal_progress.hpp"

#include "base/error.hpp"
#include "base/text.hpp"

#include <CLI/CLI.hpp>

#include <unistd.h>

#include <atomic>
#include <chrono>
#include <csignal>
#include <iostream>
#include <new>
#include <system_error>

namespace {

using namespace rillstrand;

constexpr int status_data = 1;
constexpr int status_usage = 2;
constexpr int status_machine = 3;
constexpr int status_interrupted = 130;

volatile std::sig_atomic_t stop_asked = 0;

void ask_to_stop(int) {
    stop_asked = 1;
}

std::string now_iso() {
    const auto now = std::chrono::system_clock::now().time_since_epoch();
    return text::iso_time(
        static_cast<double>(std::chrono::duration_cast<std::chrono::seconds>(now).count()));
}

/// The only place that turns a failure into words and an exit status.
int fail(int status, const std::string& what) {
    std::cerr << what << std::endl;
    return status;
}

int carry_out(const app::Job& job, bool quiet) {
    const bool terminal = ::isatty(STDERR_FILENO) != 0;
    const auto style = quiet      ? app::ProgressStyle::quiet
                       : terminal ? app::ProgressStyle::bar
                                  : app::ProgressStyle::lines;
    app::TerminalProgress progress{std::cerr, style, [] { return stop_asked != 0; }};
    const auto end = [&progress](int status, const std::string& what) {
        progress.end_line();
        return fail(status, what);
    };
    try {
        job(app::Context{std::cout, std::cerr, progress, now_iso()});
        progress.end_line();
        std::cout.flush();
        if (!std::cout)
            return fail(status_machine, "standard output cannot be written");
        return 0;
    } catch (const app::Interrupted& interrupted) {
        return end(status_interrupted, interrupted.what());
    } catch (const UsageError& error) {
        return end(status_usage, error.what());
    } catch (const DataError& error) {
        return end(status_data, error.what());
    } catch (const MachineError& error) {
        return end(status_machine, error.what());
    } catch (const std::bad_alloc&) {
        return end(status_machine, "not enough memory for this campaign; earlier output is whole");
    } catch (const std::system_error& error) {
        return end(status_machine, std::string{error.what()} + "; earlier output is whole");
    } catch (const std::exception& error) {
        return end(status_machine, std::string{"internal failure: "} + error.what() +
                                       "; earlier output is whole; please report it");
    }
}

} // namespace

int main(int argc, char** argv) {
    std::signal(SIGINT, ask_to_stop);
    std::signal(SIGTERM, ask_to_stop);
    std::signal(SIGPIPE, SIG_IGN);
    std::ios::sync_with_stdio(false);

    CLI::App cli{
        "Interprets calibrated fibre-optic temperatures: where each reading lies, whether to "
        "trust it,\nwhere groundwater comes in, what lay under snow, how water is layered."};
    cli.name("rillstrand");
    cli.set_version_flag("--version", "rillstrand " RILLSTRAND_VERSION);
    bool quiet = false;
    cli.add_flag("-q,--quiet", quiet, "No progress on standard error");
    cli.require_subcommand(1);
    cli.fallthrough();
    cli.footer(
        "Start in a folder with your traces: rillstrand draft . > campaign.toml\n"
        "Exit status: 0 done, 1 the input cannot be used, 2 wrong words, 3 the machine failed.");
    app::Job job;
    app::add_commands(cli, job);
    try {
        cli.parse(argc, argv);
    } catch (const CLI::Success& asked) {
        return cli.exit(asked); // --help, --version
    } catch (const CLI::ParseError& error) {
        return fail(status_usage,
                    std::string{"rillstrand: "} + error.what() + "; see rillstrand --help");
    }
    return carry_out(job, quiet);
}

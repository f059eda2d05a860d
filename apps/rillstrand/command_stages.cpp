// SPDX-License-Identifier: Apache-2.0
#include "command_stages.hpp"

#include "layer_tables.hpp"
#include "pipeline.hpp"

#include <CLI/CLI.hpp>

#include <array>

namespace rillstrand::app {

namespace {

/// A stage alone: what it needs is worked out first, only its own files are written.
struct Stage {
    const char* name;
    const char* words;
    bool keeps_record;               ///< record.nc is its result
    bool places;                     ///< positions are needed
    bool streams;                    ///< the stream interpretation is needed
    std::vector<const char*> tables; ///< that are its results
};

void run_stage(const Stage& stage, const std::string& file, const Context& context) {
    context.progress.stage("checking the campaign", 0.0, "");
    Session session;
    session.campaign = checked_campaign(file);
    Output output{session.campaign.output};
    gather_stage(session, output, context);
    assess_stage(session, context);
    if (stage.places)
        place_stage(session, context);
    if (stage.streams)
        stream_stage(session, context);
    const Tables tables = make_tables(session);
    for (const char* name : stage.tables)
        if (const Table* table = tables.find(name))
            output.write(std::string{"tables/"} + name + ".csv", to_csv(*table));
    session.source.reset();
    if (!stage.keeps_record)
        std::filesystem::remove(output.staging() / "record.nc");
    const auto files = output.commit();
    tell_warnings(session.warnings, context.log);
    for (const auto& name : files)
        context.out << (output.folder() / name).string() << '\n';
}

} // namespace

void add_stages(CLI::App& app, Job& job) {
    static const std::array<Stage, 4> stages{
        {{"gather", "Read the record only, into record.nc", true, false, false, {}},
         {"assess",
          "Noise, baths and faults of the record, as tables",
          false,
          false,
          false,
          {"channels", "baths", "events"}},
         {"place",
          "Put every channel on the ground, as tables",
          false,
          true,
          false,
          {"channels", "cable", "tie_points"}},
         {"stream",
          "Find what comes into the streams, as tables",
          false,
          true,
          true,
          {"inflows", "stream_channels"}}}};
    for (const Stage& stage : stages) {
        auto file = std::make_shared<std::string>();
        CLI::App* command = app.add_subcommand(stage.name, stage.words);
        command->add_option("campaign", *file, "Campaign file (TOML)")->required();
        command->callback([&stage, file, &job] {
            job = [&stage, file](const Context& context) { run_stage(stage, *file, context); };
        });
    }
}

} // namespace rillstrand::app

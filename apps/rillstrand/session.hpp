// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "placement.hpp"

#include "base/error.hpp"
#include "bed/bed.hpp"
#include "campaign/campaign.hpp"
#include "column/column.hpp"
#include "quality/adjust.hpp"
#include "quality/baths.hpp"
#include "quality/events.hpp"
#include "quality/legs.hpp"
#include "record/gather.hpp"
#include "record/scan.hpp"
#include "record/source.hpp"
#include "snow/snow.hpp"
#include "stream/stream.hpp"

#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace rillstrand::app {

/// What was found of one channel apart from numbers.
struct ChannelNames {
    std::vector<std::string> stretch; ///< empty where no stretch holds it
    std::vector<std::string> setting;
    std::vector<std::string> flag; ///< `ok`, or what is wrong, one word
};

/// All that one run has worked out so far; each stage fills its part.
struct Session {
    campaign::Campaign campaign;
    record::GatherReport gathered;
    std::unique_ptr<record::Source> source; ///< closed once everything is read
    record::Axes record_axes;
    double spatial_response_m = 1.0;
    std::optional<record::ScanSummary> scan;
    std::optional<quality::Adjustment> adjustment; ///< with [adjust]
    std::vector<quality::BathResult> baths;
    std::vector<quality::Event> events;
    std::optional<geo::Placement> placement;
    std::optional<quality::LegComparison> legs; ///< with a turnaround
    ChannelNames names;
    std::vector<stream::StreamFindings> streams;
    std::vector<snow::SnowFindings> snows;
    std::vector<column::ColumnFindings> columns;
    std::vector<bed::BedFindings> beds;
    Warnings warnings;

    const record::Axes& axes() const { return record_axes; }
};

} // namespace rillstrand::app

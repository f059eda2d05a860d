// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/gather.hpp"

/// Gathering of grids; included by sources of this room only.
namespace rillstrand::store {

/// Reads the axes of grid files.
/// @throws DataError with all problems of all files
record::Inspection inspect_grids(const campaign::Record& record,
                                 const std::vector<std::filesystem::path>& files);

/// Hands the traces of grid files on in order of time, as record::gather_text does. Memory: a few
/// blocks of rows, whatever the length of the record.
record::GatherReport gather_grids(const campaign::Record& record,
                                  const std::vector<std::filesystem::path>& files,
                                  const record::MakeSink& make_sink, Progress& progress);

} // namespace rillstrand::store

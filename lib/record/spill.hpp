// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "record/scratch_file.hpp"

#include <cstdint>
#include <filesystem>
#include <functional>
#include <optional>
#include <vector>

namespace rillstrand::record {

/// One row of a tall table on its way to its trace.
struct SpillRow {
    std::uint32_t trace = 0; ///< in its bucket
    std::uint32_t place = 0;
    std::uint32_t line = 0;
};

/// Sorts rows into buckets of traces without holding them in memory: up to 64 MB wait there, the
/// rest in a scratch file.
class Spill {
public:
    /// @param quantities  values of each row
    Spill(std::filesystem::path folder, std::size_t buckets, std::size_t quantities);
    void add(std::size_t bucket, const SpillRow& row, const float* values);
    /// Rows of one bucket in the order in which they were added.
    /// @param use  returns false to end it
    void each(std::size_t bucket,
              const std::function<bool(const SpillRow&, const float*)>& use) const;

private:
    struct Chunk {
        std::uint64_t offset = 0;
        std::size_t bytes = 0;
    };
    void write_out();
    bool each_of(const std::vector<char>& bytes,
                 const std::function<bool(const SpillRow&, const float*)>& use) const;
    std::filesystem::path m_folder;
    std::size_t m_quantities;
    std::vector<std::vector<char>> m_waiting;
    std::vector<std::vector<Chunk>> m_chunks;
    std::size_t m_waiting_bytes = 0;
    std::optional<ScratchFile> m_file;
};

} // namespace rillstrand::record

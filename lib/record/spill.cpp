// SPDX-License-Identifier: Apache-2.0
#include "record/spill.hpp"

#include <array>
#include <cstring>

namespace rillstrand::record {

namespace {
constexpr std::size_t most_waiting_bytes = std::size_t{64} << 20U;
constexpr std::size_t most_quantities = 5;
} // namespace

Spill::Spill(std::filesystem::path folder, std::size_t buckets, std::size_t quantities)
    : m_folder{std::move(folder)}, m_quantities{quantities}, m_waiting(buckets), m_chunks(buckets) {
}

void Spill::add(std::size_t bucket, const SpillRow& row, const float* values) {
    auto& waiting = m_waiting[bucket];
    const std::size_t had = waiting.size();
    const std::size_t bytes = sizeof(SpillRow) + m_quantities * sizeof(float);
    waiting.resize(had + bytes);
    std::memcpy(waiting.data() + had, &row, sizeof(SpillRow));
    std::memcpy(waiting.data() + had + sizeof(SpillRow), values, m_quantities * sizeof(float));
    m_waiting_bytes += bytes;
    if (m_waiting_bytes >= most_waiting_bytes)
        write_out();
}

void Spill::write_out() {
    if (!m_file)
        m_file.emplace(m_folder);
    for (std::size_t b = 0; b < m_waiting.size(); ++b) {
        auto& waiting = m_waiting[b];
        if (waiting.empty())
            continue;
        m_chunks[b].push_back({m_file->append(waiting.data(), waiting.size()), waiting.size()});
        waiting = {};
    }
    m_waiting_bytes = 0;
}

bool Spill::each_of(const std::vector<char>& bytes,
                    const std::function<bool(const SpillRow&, const float*)>& use) const {
    std::array<float, most_quantities> values{};
    SpillRow row;
    const std::size_t step = sizeof(SpillRow) + m_quantities * sizeof(float);
    for (std::size_t at = 0; at + step <= bytes.size(); at += step) {
        std::memcpy(&row, bytes.data() + at, sizeof(SpillRow));
        std::memcpy(values.data(), bytes.data() + at + sizeof(SpillRow),
                    m_quantities * sizeof(float));
        if (!use(row, values.data()))
            return false;
    }
    return true;
}

void Spill::each(std::size_t bucket,
                 const std::function<bool(const SpillRow&, const float*)>& use) const {
    std::vector<char> bytes;
    for (const Chunk& chunk : m_chunks[bucket]) {
        bytes.resize(chunk.bytes);
        m_file->read(chunk.offset, bytes.data(), bytes.size());
        if (!each_of(bytes, use))
            return;
    }
    each_of(m_waiting[bucket], use);
}

} // namespace rillstrand::record

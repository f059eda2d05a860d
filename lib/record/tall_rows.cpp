// SPDX-License-Identifier: Apache-2.0
#include "record/tall_rows.hpp"

#include "record/row_cursor.hpp"
#include "record/text_input.hpp"

#include <tbb/parallel_for.h>

#include <array>
#include <cmath>

namespace rillstrand::record {

namespace {

constexpr std::size_t block_bytes = std::size_t{1} << 20U;
constexpr std::size_t blocks_at_once = 8;

/// Parses blocks of one file.
class TallParser {
public:
    TallParser(const campaign::Record& record, const TextHead& head)
        : m_options{record.text}, m_head{head}, m_cells{record, head.temperature_unit,
                                                        head.decimal},
          m_quantities{1 + head.power_cells.size()} {}

    /// @param skip  lines of the block that are head
    void parse(TallBlock& block, std::size_t skip) const {
        std::string_view text = block.text;
        const char* feed = nullptr;
        std::vector<std::string_view> cells;
        while (!text.empty()) {
            const std::string_view line = take_line(text, feed);
            const std::size_t number = block.lines++;
            if (number < skip || take_fast(line, number, block) || is_comment(line, m_options))
                continue;
            block.wrong = take(line, number, block, cells);
            if (!block.wrong.empty()) {
                block.wrong_line = number;
                return;
            }
        }
    }

private:
    struct Row {
        std::string_view stamp;
        double distance = 0.0;
        std::array<float, 5> values{};
        CellCounts counts;
    };

    /// @return false if anything is unusual
    bool take_fast(std::string_view line, std::size_t number, TallBlock& block) const {
        if (line.find('"') != std::string_view::npos || is_comment(line, m_options))
            return false;
        RowCursor cursor{line, m_head.delimiter};
        Row row;
        for (std::size_t i = 0; i < m_head.cells; ++i)
            if (!take_fast_cell(cursor, i, row) || cursor.step() != (i + 1 < m_head.cells))
                return false;
        if (row.stamp.empty() || std::isnan(m_cells.seen(row.distance)))
            return false;
        keep(row, number, block);
        return true;
    }

    bool take_fast_cell(RowCursor& cursor, std::size_t cell, Row& row) const {
        double value = 0.0;
        if (cell == m_head.distance_cell)
            return cursor.number(m_head.decimal, row.distance);
        if (cell == m_head.temperature_cell) {
            if (!cursor.number(m_head.decimal, value))
                return m_cells.temperature(cursor.cell(), row.values[0], row.counts);
            row.values[0] = m_cells.temperature(value, row.counts);
            return true;
        }
        const std::string_view text = cursor.cell();
        if (cell == m_head.time_cell)
            row.stamp = text;
        else if (cell > m_head.time_cell && cell < m_head.time_cell + m_head.time_cells)
            row.stamp = {row.stamp.data(),
                         static_cast<std::size_t>(text.data() + text.size() - row.stamp.data())};
        else
            for (std::size_t q = 0; q < m_head.power_cells.size(); ++q)
                if (cell == m_head.power_cells[q].second) {
                    if (!m_cells.number(text, value))
                        return false;
                    row.values[q + 1] = static_cast<float>(value);
                }
        return true;
    }

    /// @return what is wrong with the row, if anything is
    std::string take(std::string_view line, std::size_t number, TallBlock& block,
                     std::vector<std::string_view>& cells) const {
        split_cells(line, m_head.delimiter, cells, m_head.cells);
        if (cells.size() != m_head.cells)
            return ragged(cells.size(), m_head.cells);
        Row row;
        row.stamp = stamp_of(m_head, cells);
        const auto wrong = [&](std::size_t cell, const std::string& what) {
            return no_number(cells[cell], what, m_head.decimal);
        };
        if (!m_cells.number(cells[m_head.distance_cell], row.distance) || std::isnan(row.distance))
            return wrong(m_head.distance_cell, "distance");
        if (!m_cells.temperature(cells[m_head.temperature_cell], row.values[0], row.counts))
            return wrong(m_head.temperature_cell, "temperature");
        for (std::size_t q = 0; q < m_head.power_cells.size(); ++q) {
            double power = 0.0;
            if (!m_cells.number(cells[m_head.power_cells[q].second], power))
                return wrong(m_head.power_cells[q].second, "power");
            row.values[q + 1] = static_cast<float>(power);
        }
        keep(row, number, block);
        return {};
    }

    void keep(const Row& row, std::size_t number, TallBlock& block) const {
        if (block.groups.empty() || block.groups.back().stamp != row.stamp)
            block.groups.push_back({row.stamp, block.distance_m.size(), 0});
        ++block.groups.back().count;
        block.distance_m.push_back(to_metres(row.distance, m_head.distance_unit));
        for (std::size_t q = 0; q < m_quantities; ++q)
            block.values.push_back(row.values[q]);
        block.line.push_back(static_cast<std::uint32_t>(number));
        block.counts.add(row.counts);
    }

    const campaign::RecordText& m_options;
    const TextHead& m_head;
    CellReader m_cells;
    std::size_t m_quantities;
};

/// Lines of a text, counted up to `most`.
std::size_t count_lines(std::string_view text, std::size_t most) {
    const char* feed = nullptr;
    std::size_t count = 0;
    for (; count < most && !text.empty(); ++count)
        take_line(text, feed);
    return count;
}

/// Empties a block but keeps its memory.
void clear(TallBlock& block) {
    block.groups.clear();
    block.distance_m.clear();
    block.values.clear();
    block.line.clear();
    block.lines = 0;
    block.counts = {};
    block.wrong.clear();
}

} // namespace

CellCounts each_group(
    const TextJob& job, const TextHead& head,
    const std::function<void(const TallBlock&, const TallGroup&, std::size_t first_line)>& use) {
    const TallParser parser{job.record, head};
    BlockSource source{head.file, block_bytes};
    std::array<TallBlock, blocks_at_once> blocks;
    CellCounts counts;
    std::size_t first_line = 1;
    std::size_t head_lines = head.first_data_line - 1;
    std::uint64_t taken = 0;
    for (bool more = true; more;) {
        std::size_t filled = 0;
        while (filled < blocks.size() && more) {
            clear(blocks[filled]);
            more = source.next(blocks[filled].text);
            filled += more ? 1 : 0;
        }
        std::array<std::size_t, blocks_at_once> skip{};
        for (std::size_t k = 0; k < filled && head_lines > 0; ++k) {
            skip[k] = count_lines(blocks[k].text, head_lines);
            head_lines -= skip[k];
        }
        tbb::parallel_for(std::size_t{0}, filled,
                          [&](std::size_t k) { parser.parse(blocks[k], skip[k]); });
        for (std::size_t k = 0; k < filled; ++k) {
            const TallBlock& block = blocks[k];
            for (const TallGroup& group : block.groups)
                use(block, group, first_line);
            if (!block.wrong.empty())
                refuse(head.file, first_line + block.wrong_line, block.wrong);
            first_line += block.lines;
            counts.add(block.counts);
        }
        job.progress.advance(static_cast<double>(source.taken() - taken) * 1e-6);
        taken = source.taken();
    }
    return counts;
}

} // namespace rillstrand::record

// SPDX-License-Identifier: Apache-2.0
#include "store/grid_gather.hpp"

#include "base/text.hpp"
#include "record/row_order.hpp"
#include "store/open.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <list>
#include <mutex>
#include <utility>

namespace rillstrand::store {

namespace {

namespace fs = std::filesystem;

/// One trace of one file.
struct Place {
    double time_s = 0.0;
    std::uint32_t file = 0;
    std::uint32_t row = 0;
};

/// What the heads of all files say together.
struct Heads {
    Eigen::ArrayXd distance_m; ///< of the first file
    std::vector<record::Quantity> quantities;
    std::vector<Eigen::ArrayXd> other_m; ///< by file; empty where as the first file's
    std::vector<Place> places;           ///< in order of time
    Warnings warnings;
};

Heads read_heads(const campaign::Record& record, const std::vector<fs::path>& files) {
    Heads heads;
    heads.other_m.resize(files.size());
    Problems problems;
    for (std::size_t f = 0; f < files.size(); ++f) {
        try {
            const Grid grid{files[f], record};
            const GridHead& head = grid.head();
            if (heads.distance_m.size() == 0) {
                heads.distance_m = head.axes.distance_m;
                heads.quantities = head.quantities;
            }
            record::check_axes(heads.distance_m, files.front().string(), head.axes.distance_m,
                               files[f].string(), record.align);
            if (head.axes.distance_m.size() != heads.distance_m.size() ||
                (head.axes.distance_m - heads.distance_m).abs().maxCoeff() >= 1e-6)
                heads.other_m[f] = head.axes.distance_m;
            for (Eigen::Index i = 0; i < head.axes.n_time(); ++i)
                heads.places.push_back({head.axes.time_s(i), static_cast<std::uint32_t>(f),
                                        static_cast<std::uint32_t>(i)});
            heads.warnings.insert(heads.warnings.end(), head.warnings.begin(), head.warnings.end());
        } catch (const DataError& error) {
            problems.add(error);
        }
    }
    problems.throw_if_any();
    std::stable_sort(heads.places.begin(), heads.places.end(),
                     [](const Place& a, const Place& b) { return a.time_s < b.time_s; });
    return heads;
}

/// Consecutive rows of one file, read with all columns.
struct Rows {
    std::uint32_t file = 0;
    Eigen::Index first = 0;
    std::vector<Eigen::ArrayXXf> values; ///< one a quantity
    bool holds(const Place& place) const {
        return place.file == file && place.row >= first &&
               place.row < first + values.front().rows();
    }
};

/// Reads traces by their place; keeps the last few blocks and open files.
class RowReader {
public:
    RowReader(const campaign::Record& record, const std::vector<fs::path>& files,
              const Heads& heads, record::CellCounts& counts)
        : m_record{record}, m_files{files}, m_heads{heads}, m_counts{counts} {}

    record::Trace read(const Place& place) {
        const Rows& rows = block(place);
        record::Trace trace;
        trace.time_s = place.time_s;
        trace.origin = m_files[place.file].string() + " (trace " + std::to_string(place.row) + ")";
        const Eigen::Index i = static_cast<Eigen::Index>(place.row) - rows.first;
        const Eigen::ArrayXd& other_m = m_heads.other_m[place.file];
        for (const Eigen::ArrayXXf& values : rows.values) {
            Eigen::ArrayXf row = values.row(i);
            if (other_m.size() > 0)
                row = record::on_axis(other_m, row, m_heads.distance_m, m_record.align);
            trace.rows.push_back(std::move(row));
        }
        return trace;
    }

private:
    const Rows& block(const Place& place) {
        const auto found = std::find_if(m_blocks.begin(), m_blocks.end(),
                                        [&](const Rows& rows) { return rows.holds(place); });
        if (found != m_blocks.end())
            return *found;
        constexpr std::size_t most_blocks = 2;
        if (m_blocks.size() >= most_blocks)
            m_blocks.pop_back();
        m_blocks.push_front(read_block(place));
        return m_blocks.front();
    }

    Rows read_block(const Place& place) {
        const Grid& grid = open(place.file);
        const record::Axes& axes = grid.head().axes;
        Rows rows;
        rows.file = place.file;
        const Eigen::Index size = rows_of_block(grid);
        rows.first = static_cast<Eigen::Index>(place.row) / size * size;
        const Eigen::Index count = std::min(size, axes.n_time() - rows.first);
        const Eigen::Index width = std::min(grid.block_columns(), axes.n_place());
        const Eigen::Index pieces = (axes.n_place() + width - 1) / width;
        for (const auto quantity : m_heads.quantities) {
            Eigen::ArrayXXf& values = rows.values.emplace_back(count, axes.n_place());
            tbb::parallel_for(Eigen::Index{0}, pieces, [&](Eigen::Index piece) {
                const Eigen::Index j = piece * width;
                const Eigen::Index columns = std::min(width, axes.n_place() - j);
                record::CellCounts counts;
                grid.read(quantity, rows.first, j, values.middleCols(j, columns), counts);
                const std::lock_guard lock{m_mutex};
                m_counts.add(counts);
            });
        }
        return rows;
    }

    /// A row of stored blocks; many of them where they are low, part of one where they are high.
    static Eigen::Index rows_of_block(const Grid& grid) {
        constexpr Eigen::Index most_bytes = Eigen::Index{48} << 20;
        const Eigen::Index row_bytes =
            std::max<Eigen::Index>(1, grid.head().axes.n_place() * Eigen::Index{sizeof(float)});
        const Eigen::Index stored = std::max<Eigen::Index>(1, grid.block_rows());
        const Eigen::Index most = std::max<Eigen::Index>(1, most_bytes / row_bytes);
        if (stored >= most)
            return most;
        constexpr Eigen::Index enough = 128;
        return std::min(most, stored >= enough ? stored : (enough + stored - 1) / stored * stored);
    }

    const Grid& open(std::uint32_t file) {
        const auto found = std::find_if(m_open.begin(), m_open.end(),
                                        [&](const auto& grid) { return grid.first == file; });
        if (found != m_open.end())
            return found->second;
        constexpr std::size_t most_open = 4;
        if (m_open.size() >= most_open)
            m_open.pop_back();
        m_open.emplace_front(file, Grid{m_files[file], m_record});
        return m_open.front().second;
    }

    const campaign::Record& m_record;
    const std::vector<fs::path>& m_files;
    const Heads& m_heads;
    record::CellCounts& m_counts;
    std::mutex m_mutex;
    std::list<std::pair<std::uint32_t, Grid>> m_open;
    std::list<Rows> m_blocks;
};

} // namespace

record::Inspection inspect_grids(const campaign::Record& record,
                                 const std::vector<fs::path>& files) {
    record::Inspection inspection;
    inspection.layout = campaign::Layout::grid;
    inspection.files = files;
    inspection.distance_m = read_heads(record, files).distance_m;
    return inspection;
}

record::GatherReport gather_grids(const campaign::Record& record,
                                  const std::vector<fs::path>& files,
                                  const record::MakeSink& make_sink, Progress& progress) {
    record::GatherReport report;
    report.layout = campaign::Layout::grid;
    report.files = files;
    const Heads heads = read_heads(record, files);
    report.warnings = heads.warnings;
    std::vector<double> times_s;
    times_s.reserve(heads.places.size());
    for (const Place& place : heads.places)
        times_s.push_back(place.time_s);
    report.interval_s = record::tell_interval(record, std::move(times_s), report);
    record::Sink& sink =
        make_sink({heads.distance_m, heads.quantities,
                   static_cast<std::int64_t>(heads.places.size()), report.interval_s});
    progress.stage("reading the grid", static_cast<double>(heads.places.size()), "traces");
    record::RowOrder order{record, report, sink};
    RowReader reader{record, files, heads, report.cells};
    for (const Place& place : heads.places) {
        order.take(reader.read(place));
        progress.advance(1.0);
    }
    order.finish();
    return report;
}

} // namespace rillstrand::store

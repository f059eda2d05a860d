// SPDX-License-Identifier: Apache-2.0
#include "store/open.hpp"

#include "base/text.hpp"
#include "store/grid_axes.hpp"
#include "store/library.hpp"
#include "store/tiles.hpp"

#include <algorithm>
#include <array>
#include <utility>

namespace rillstrand::store {

namespace {

using record::Quantity;

struct Named {
    Quantity quantity = Quantity::temperature;
    std::string variable;
    const char* key = "";
};

std::vector<Named> wanted(const campaign::RecordGrid& grid) {
    std::vector<Named> names{{Quantity::temperature, grid.variable, "record.grid.variable"}};
    const auto add = [&](Quantity quantity, const std::optional<std::string>& name,
                         const char* key) {
        if (name)
            names.push_back({quantity, *name, key});
    };
    add(Quantity::stokes, grid.stokes, "record.grid.stokes");
    add(Quantity::antistokes, grid.antistokes, "record.grid.antistokes");
    add(Quantity::reverse_stokes, grid.reverse_stokes, "record.grid.reverse_stokes");
    add(Quantity::reverse_antistokes, grid.reverse_antistokes, "record.grid.reverse_antistokes");
    return names;
}

/// One quantity of a file, ready to be read.
struct Channelled {
    Quantity quantity = Quantity::temperature;
    Decoding decoding;
    std::unique_ptr<Tiles> tiles;
};

std::size_t index(Eigen::Index i) {
    return static_cast<std::size_t>(i);
}

} // namespace

class Grid::Data {
public:
    Data(std::filesystem::path path, const campaign::Record& record, bool general_path_only)
        : file{std::move(path)} {
        const LibraryLock lock;
        auto grid = std::make_shared<GdalGrid>(file);
        std::vector<std::pair<Named, Array>> arrays;
        for (const Named& named : wanted(record.grid))
            arrays.emplace_back(named, find_variable(*grid, named.variable, named.key));
        const Array temperature = arrays.front().second;
        GridAxes axes = read_axes(*grid, temperature, record);
        for (const auto& [named, array] : arrays)
            check_shape(*grid, temperature, array);
        time_first = axes.time_first;
        unit = temperature_unit(*grid, temperature, record);
        note_zero_fill(temperature);
        for (auto& [named, array] : arrays)
            quantities.push_back({named.quantity, decoding_of(array), nullptr});
        open_tiles(std::move(grid), arrays, general_path_only);
        set_axes(std::move(axes));
        cells = std::make_unique<record::CellReader>(record, unit, '.');
    }

    const Channelled& of(Quantity quantity) const {
        const auto found = std::find_if(quantities.begin(), quantities.end(),
                                        [&](const auto& q) { return q.quantity == quantity; });
        if (found == quantities.end())
            throw DataError{file.string() + ": holds no such power; say its variable in "
                                            "[record.grid]"};
        return *found;
    }

    /// A block by row and column of the record, whatever the stored order of either.
    template <typename Value>
    void read_stored(const Channelled& from, Eigen::Index i_time, Eigen::Index j_place,
                     Eigen::Index rows, Eigen::Index columns, Value* out, std::ptrdiff_t row_step,
                     std::ptrdiff_t column_step) const {
        Eigen::Index first = j_place;
        Value* at = out;
        if (head.distance_reversed) { // the stored block runs the other way
            first = head.axes.n_place() - j_place - columns;
            at = out + (columns - 1) * column_step;
            column_step = -column_step;
        }
        if (time_first)
            from.tiles->read({index(i_time), index(first), index(rows), index(columns)},
                             from.decoding, Target<Value>{at, row_step, column_step});
        else
            from.tiles->read({index(first), index(i_time), index(columns), index(rows)},
                             from.decoding, Target<Value>{at, column_step, row_step});
    }

    std::filesystem::path file;
    GridHead head;
    bool time_first = true;
    bool fast = false;
    campaign::TemperatureUnit unit = campaign::TemperatureUnit::degC;
    std::vector<Channelled> quantities;
    std::unique_ptr<record::CellReader> cells;

private:
    static void check_shape(const GdalGrid& grid, const Array& first, const Array& other) {
        const auto& a = first->GetDimensions();
        const auto& b = other->GetDimensions();
        if (a.size() != b.size() ||
            !std::equal(a.begin(), a.end(), b.begin(), [](const auto& x, const auto& y) {
                return x->GetFullName() == y->GetFullName();
            }))
            grid.refuse("the variables \"" + first->GetName() + "\" and \"" + other->GetName() +
                        "\" do not have the same dimensions in the same order");
    }

    void note_zero_fill(const Array& temperature) {
        if (zero_is_fill(temperature))
            head.warnings.push_back(
                {"grid-zero-fill", file.string() + ": the fill value of \"" +
                                       temperature->GetName() +
                                       "\" is 0, so that a temperature of exactly 0 counts as "
                                       "missing; write the store with another fill value"});
    }

    void open_tiles(std::shared_ptr<const GdalGrid> grid,
                    const std::vector<std::pair<Named, Array>>& arrays, bool general_path_only) {
        for (std::size_t q = 0; q < arrays.size(); ++q) {
            auto& tiles = quantities[q].tiles;
            if (!general_path_only)
                tiles = open_chunks(file, arrays[q].first.variable);
            if (q == 0)
                fast = tiles != nullptr;
            if (!tiles)
                tiles = open_general(grid, arrays[q].second);
        }
    }

    void set_axes(GridAxes axes) {
        head.axes.time_s = std::move(axes.time_s);
        const Eigen::Index n = axes.distance_m.size();
        head.distance_reversed = n > 1 && axes.distance_m(1) < axes.distance_m(0);
        if (head.distance_reversed) {
            axes.distance_m.reverseInPlace();
            head.warnings.push_back(
                {"grid-distances-fall", file.string() + ": the distances fall from " +
                                            text::number(axes.distance_m(n - 1)) + " to " +
                                            text::number(axes.distance_m(0)) +
                                            " m; the channels are turned round"});
        }
        head.axes.distance_m = std::move(axes.distance_m);
        for (const auto& q : quantities)
            head.quantities.push_back(q.quantity);
    }
};

Grid::Grid(std::filesystem::path file, const campaign::Record& record, bool general_path_only)
    : m_data{std::make_unique<Data>(std::move(file), record, general_path_only)} {}
Grid::Grid(Grid&&) noexcept = default;
Grid& Grid::operator=(Grid&&) noexcept = default;
Grid::~Grid() = default;

const std::filesystem::path& Grid::file() const {
    return m_data->file;
}
const GridHead& Grid::head() const {
    return m_data->head;
}
bool Grid::decoded_here() const {
    return m_data->fast;
}

Eigen::Index Grid::block_rows() const {
    return static_cast<Eigen::Index>(
        m_data->quantities.front().tiles->block_size()[m_data->time_first ? 0 : 1]);
}

Eigen::Index Grid::block_columns() const {
    return static_cast<Eigen::Index>(
        m_data->quantities.front().tiles->block_size()[m_data->time_first ? 1 : 0]);
}

void Grid::read(Quantity quantity, Eigen::Index i_time, Eigen::Index j_place,
                Eigen::Ref<Eigen::ArrayXXf> out, record::CellCounts& counts) const {
    const Channelled& from = m_data->of(quantity);
    if (quantity != Quantity::temperature) {
        m_data->read_stored(from, i_time, j_place, out.rows(), out.cols(), out.data(), 1,
                            out.outerStride());
        return;
    }
    Eigen::ArrayXXd stored(out.rows(), out.cols());
    m_data->read_stored(from, i_time, j_place, out.rows(), out.cols(), stored.data(), 1,
                        stored.rows());
    for (Eigen::Index j = 0; j < out.cols(); ++j)
        for (Eigen::Index i = 0; i < out.rows(); ++i)
            out(i, j) = m_data->cells->temperature(stored(i, j), counts);
}

namespace {

/// A grid as a source; `plain` takes the numbers as they are (a canonical record).
class GridSource final : public record::Source {
public:
    GridSource(const std::filesystem::path& file, const campaign::Record& record)
        : m_grid{file, record}, m_axes{m_grid.head().axes} {
        for (Eigen::Index i = 1; i < m_axes.n_time(); ++i)
            if (!(m_axes.time_s(i) > m_axes.time_s(i - 1)))
                throw DataError{file.string() + ": the time at index " + std::to_string(i) + " (" +
                                text::iso_time(m_axes.time_s(i)) +
                                ") does not come after the one before it; sort the traces"};
        if (record.interval_s) {
            m_axes.interval_s = *record.interval_s;
        } else if (m_axes.n_time() > 1) {
            std::vector<double> steps;
            for (Eigen::Index i = 1; i < m_axes.n_time(); ++i)
                steps.push_back(m_axes.time_s(i) - m_axes.time_s(i - 1));
            const auto middle = steps.begin() + static_cast<std::ptrdiff_t>(steps.size() / 2);
            std::nth_element(steps.begin(), middle, steps.end());
            m_axes.interval_s = *middle;
        }
    }
    const record::Axes& axes() const override { return m_axes; }
    bool has(Quantity quantity) const override {
        const auto& list = m_grid.head().quantities;
        return std::find(list.begin(), list.end(), quantity) != list.end();
    }
    Eigen::Index block_rows() const override { return m_grid.block_rows(); }
    Eigen::Index block_columns() const override { return m_grid.block_columns(); }
    void read(Quantity quantity, Eigen::Index i_time, Eigen::Index j_place,
              Eigen::Ref<Eigen::ArrayXXf> out) const override {
        record::CellCounts counts;
        m_grid.read(quantity, i_time, j_place, out, counts);
    }

private:
    Grid m_grid;
    record::Axes m_axes;
};

} // namespace

std::unique_ptr<record::Source> open_grid(const std::filesystem::path& file,
                                          const campaign::Record& record) {
    return std::make_unique<GridSource>(file, record);
}

} // namespace rillstrand::store

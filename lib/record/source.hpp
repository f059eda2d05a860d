// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <string>
#include <vector>

namespace rillstrand::record {

/// What a record may carry beside temperature.
enum class Quantity { temperature, stokes, antistokes, reverse_stokes, reverse_antistokes };

/// The two axes of a record.
struct Axes {
    Eigen::ArrayXd time_s;     ///< UTC seconds since 1970-01-01, middle of the averaging interval,
                               ///< strictly increasing
    double interval_s = 0.0;   ///< averaging interval
    Eigen::ArrayXd distance_m; ///< fibre distance of each channel, strictly increasing

    Eigen::Index n_time() const { return time_s.size(); }
    Eigen::Index n_place() const { return distance_m.size(); }
};

/// Channels whose fibre distance lies in [from, to] (with a tolerance of 1 mm).
struct PlaceRange {
    Eigen::Index first = 0;
    Eigen::Index count = 0;
};
PlaceRange places_between(const Axes& axes, double from_m, double to_m);

/// A record that is read tile by tile. Rows are times, columns are places along the fibre; missing
/// is NaN. Implementations may be read from several threads at once.
class Source {
public:
    Source() = default;
    Source(const Source&) = delete;
    Source& operator=(const Source&) = delete;
    Source(Source&&) = delete;
    Source& operator=(Source&&) = delete;
    virtual ~Source() = default;

    virtual const Axes& axes() const = 0;
    virtual bool has(Quantity quantity) const = 0;
    /// Rows and columns of one stored block: reading along these is cheapest.
    virtual Eigen::Index block_rows() const = 0;
    virtual Eigen::Index block_columns() const = 0;
    /// Fills `out` (row = time, column = place, column-major) with rows [i_time, i_time + rows) and
    /// columns [j_place, j_place + columns) of a quantity: degC for temperature, the instrument's
    /// own unit for powers. NaN where missing.
    /// @throws DataError if the block cannot be read
    virtual void read(Quantity quantity, Eigen::Index i_time, Eigen::Index j_place,
                      Eigen::Ref<Eigen::ArrayXXf> out) const = 0;
};

/// A record held in memory: small campaigns, tests, simulations.
class MemorySource final : public Source {
public:
    /// @param temperature_degC  row = time, column = place; NaN where missing
    MemorySource(Axes axes, Eigen::ArrayXXf temperature_degC);
    void add(Quantity quantity, Eigen::ArrayXXf values);

    const Axes& axes() const override { return m_axes; }
    bool has(Quantity quantity) const override;
    Eigen::Index block_rows() const override { return m_axes.n_time(); }
    Eigen::Index block_columns() const override { return 256; }
    void read(Quantity quantity, Eigen::Index i_time, Eigen::Index j_place,
              Eigen::Ref<Eigen::ArrayXXf> out) const override;

private:
    Axes m_axes;
    std::vector<std::pair<Quantity, Eigen::ArrayXXf>> m_values;
};

/// Where rows go while a record is gathered. Rows come in order of time.
class Sink {
public:
    Sink() = default;
    Sink(const Sink&) = delete;
    Sink& operator=(const Sink&) = delete;
    Sink(Sink&&) = delete;
    Sink& operator=(Sink&&) = delete;
    virtual ~Sink() = default;
    /// @param time_s  UTC, middle of the interval
    /// @param rows    one array of n_place values per quantity, in the order agreed at the start
    virtual void add_row(double time_s, const std::vector<Eigen::ArrayXf>& rows) = 0;
};

} // namespace rillstrand::record

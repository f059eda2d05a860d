// SPDX-License-Identifier: Apache-2.0
#include "store/canonical.hpp"

#include "base/error.hpp"
#include "base/text.hpp"
#include "store/chunk_codec.hpp"
#include "store/rows_file.hpp"

#include <algorithm>
#include <cassert>
#include <system_error>

namespace rillstrand::store {

namespace {

void check_distances(const std::filesystem::path& path, const Eigen::ArrayXd& distance_m) {
    if (distance_m.size() == 0)
        throw DataError{path.string() + ": the record has no channel"};
    for (Eigen::Index j = 0; j < distance_m.size(); ++j)
        if (!std::isfinite(distance_m(j)) || (j > 0 && !(distance_m(j) > distance_m(j - 1))))
            throw DataError{path.string() + ": fibre distance " + text::number(distance_m(j)) +
                            " m of channel " + std::to_string(j) +
                            " does not lie beyond the one before; distances must increase"};
}

} // namespace

class CanonicalWriter::Data {
public:
    Data(std::filesystem::path path, CanonicalHead head)
        : m_path{std::move(path)}, m_head{std::move(head)}, m_ranges(m_head.quantities.size()) {
        assert(!m_head.quantities.empty() &&
               m_head.quantities.front() == record::Quantity::temperature);
        check_distances(m_path, m_head.distance_m);
        m_hold_rows = static_cast<std::size_t>(
            chunk_rows(m_head.interval_s, m_head.distance_m.size(), sizeof(float)));
        // A folder that cannot be written is told now and not after the first rows.
        RowsFile{m_path, m_head, Packing::floating};
    }
    Data(const Data&) = delete;
    Data& operator=(const Data&) = delete;
    Data(Data&&) = delete;
    Data& operator=(Data&&) = delete;
    ~Data() {
        m_file.reset();
        if (m_finished)
            return;
        std::error_code ignored;
        std::filesystem::remove(m_path, ignored);
        std::filesystem::remove(wider_path(), ignored);
    }

    void add_row(double time_s, const std::vector<Eigen::ArrayXf>& rows) {
        assert(rows.size() == m_head.quantities.size());
        assert(m_times_s.empty() || time_s > m_times_s.back());
        std::vector<const float*> pointers;
        for (std::size_t q = 0; q < rows.size(); ++q) {
            assert(rows[q].size() == m_head.distance_m.size());
            pointers.push_back(rows[q].data());
            m_ranges[q].add(rows[q].data(), rows[q].size());
        }
        m_times_s.push_back(time_s);
        const std::span<const float> temperature{rows.front().data(),
                                                 static_cast<std::size_t>(rows.front().size())};
        while (!returns(m_packing, temperature))
            m_packing = next_wider(m_packing);
        if (m_file) {
            if (m_packing != m_file->packing())
                widen();
            m_file->add_row(pointers);
            return;
        }
        m_held.push_back(rows);
        if (m_held.size() >= m_hold_rows)
            begin_file();
    }

    void finish() {
        if (m_times_s.empty())
            throw DataError{m_path.string() + ": the record has no trace"};
        if (!m_file)
            begin_file();
        m_file->finish(m_times_s, m_ranges);
        m_file.reset();
        m_finished = true;
    }

    Packing packing() const { return m_packing; }
    Eigen::Index n_time() const { return static_cast<Eigen::Index>(m_times_s.size()); }

private:
    static Packing next_wider(Packing packing) {
        return packing == Packing::hundredths ? Packing::thousandths : Packing::floating;
    }

    std::filesystem::path wider_path() const {
        std::filesystem::path wider = m_path;
        wider += ".wider";
        return wider;
    }

    void begin_file() {
        m_file = std::make_unique<RowsFile>(m_path, m_head, m_packing);
        std::vector<const float*> pointers(m_head.quantities.size());
        for (const auto& rows : m_held) {
            std::transform(rows.begin(), rows.end(), pointers.begin(),
                           [](const Eigen::ArrayXf& row) { return row.data(); });
            m_file->add_row(pointers);
        }
        m_held = {};
    }

    /// Writes all rows so far again in the packing that the new row needs.
    void widen() {
        auto wider = std::make_unique<RowsFile>(wider_path(), m_head, m_packing);
        m_file->replay([&](const std::vector<const float*>& row) { wider->add_row(row); });
        m_file.reset();
        m_file = std::move(wider);
        std::filesystem::rename(wider_path(), m_path);
        m_file->moved_to(m_path);
    }

    std::filesystem::path m_path;
    CanonicalHead m_head;
    std::vector<double> m_times_s;
    std::vector<Range> m_ranges;
    Packing m_packing = Packing::hundredths;
    std::size_t m_hold_rows = 1;
    std::vector<std::vector<Eigen::ArrayXf>> m_held; ///< first rows, until the packing is told
    std::unique_ptr<RowsFile> m_file;
    bool m_finished = false;
};

CanonicalWriter::CanonicalWriter(std::filesystem::path path, CanonicalHead head)
    : m_data{std::make_unique<Data>(std::move(path), std::move(head))} {}
CanonicalWriter::~CanonicalWriter() = default;

void CanonicalWriter::add_row(double time_s, const std::vector<Eigen::ArrayXf>& rows) {
    m_data->add_row(time_s, rows);
}

void CanonicalWriter::finish() {
    m_data->finish();
}
Packing CanonicalWriter::packing() const {
    return m_data->packing();
}
Eigen::Index CanonicalWriter::n_time() const {
    return m_data->n_time();
}

} // namespace rillstrand::store

// SPDX-License-Identifier: Apache-2.0
#include "survey.hpp"

#include "base/text.hpp"
#include "record/delimited.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rillstrand::geo {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Fibre distance from the metre marks on the jacket: a straight line through the pairs.
struct CableMarks {
    double offset_m = 0.0;
    double rate = 1.0; ///< fibre metres per mark metre; negative where the marks run backwards
    double sd_m = 0.0; ///< of a single pair about the line
};

CableMarks read_cable_marks(const std::filesystem::path& file) {
    const record::Delimited table = record::read_delimited(file);
    const auto cable = table.column("cable_m"), fibre = table.column("fibre_m");
    if (!cable || !fibre)
        throw DataError{file.string() + ":1: needs the columns cable_m and fibre_m"};
    std::vector<std::array<double, 2>> pairs;
    for (std::size_t i = 0; i < table.rows.size(); ++i) {
        const auto c = table.number(i, *cable), f = table.number(i, *fibre);
        if (c && f)
            pairs.push_back({*c, *f});
    }
    if (pairs.size() < 2)
        throw DataError{
            file.string() +
            ": at least two pairs of cable_m and fibre_m tell offset and direction; add "
            "pairs"};
    double mc = 0.0, mf = 0.0, scc = 0.0, scf = 0.0;
    const auto n = static_cast<double>(pairs.size());
    for (const auto& [c, f] : pairs) {
        mc += c / n;
        mf += f / n;
    }
    for (const auto& [c, f] : pairs) {
        scc += (c - mc) * (c - mc);
        scf += (c - mc) * (f - mf);
    }
    if (scc <= 0.0)
        throw DataError{file.string() + ": all pairs stand at one mark; add others"};
    CableMarks marks;
    marks.rate = scf / scc;
    marks.offset_m = mf - marks.rate * mc;
    double rest = 0.0;
    for (const auto& [c, f] : pairs)
        rest += std::pow(f - marks.offset_m - marks.rate * c, 2);
    marks.sd_m = n > 2.0 ? std::sqrt(rest / (n - 2.0)) : 0.5;
    if (std::abs(std::abs(marks.rate) - 1.0) > 0.1)
        throw DataError{file.string() + ": the pairs say " + text::fixed(marks.rate, 3) +
                        " fibre metres per metre of jacket; that is no cable, check for feet or "
                        "exchanged columns"};
    return marks;
}

class SurveyReader {
public:
    explicit SurveyReader(const campaign::Placement& placement)
        : m_placement{placement}, m_table{record::read_delimited(placement.tie_points)} {}

    Survey read() {
        find_columns();
        for (std::size_t i = 0; i < m_table.rows.size(); ++i) {
            try {
                read_row(i);
            } catch (const DataError& error) {
                m_problems.add(error);
            }
        }
        m_problems.throw_if_any();
        std::stable_sort(
            m_survey.points.begin(), m_survey.points.end(),
            [](const TiePoint& a, const TiePoint& b) { return a.fibre_m < b.fibre_m; });
        check();
        return m_survey;
    }

private:
    void find_columns() {
        m_fibre = m_table.column("fibre_m");
        const auto cable = m_table.column("cable_m");
        if (!m_fibre && cable) {
            if (!m_placement.cable_marks)
                throw DataError{m_table.file.string() +
                                ":1: gives cable_m, the marks on the jacket; say "
                                "placement.cable_marks with at least two pairs cable_m,fibre_m"};
            m_fibre = cable;
            m_marks = read_cable_marks(*m_placement.cable_marks);
        }
        m_x = m_table.column("x");
        m_y = m_table.column("y");
        if (!m_fibre || !m_x || !m_y) {
            std::string list;
            for (const auto& name : m_table.header)
                list += (list.empty() ? "" : ", ") + name;
            throw DataError{m_table.file.string() +
                            ":1: needs the columns fibre_m (or cable_m), x and y; it has " + list};
        }
        m_z = m_table.column("z");
        m_sd = m_table.column("sd_m");
        m_label = m_table.column("label");
    }

    double need(std::size_t row, std::size_t cell) const {
        const auto value = m_table.number(row, cell);
        if (!value)
            throw DataError{m_table.place(row) + ": " + m_table.header[cell] +
                            " is empty; give the number or remove the row"};
        return *value;
    }

    void read_row(std::size_t i) {
        TiePoint tie;
        tie.place = m_table.place(i);
        tie.fibre_m = m_marks.offset_m + m_marks.rate * need(i, *m_fibre);
        tie.fibre_sd_m = m_marks.sd_m;
        tie.x = need(i, *m_x);
        tie.y = need(i, *m_y);
        tie.z = m_z ? m_table.number(i, *m_z).value_or(nan) : nan;
        const auto sd = m_sd ? m_table.number(i, *m_sd) : std::nullopt;
        tie.sd_said = sd.has_value();
        tie.sd_m = sd.value_or(default_tie_sd_m);
        if (tie.sd_m < 0.0)
            throw DataError{tie.place + ": sd_m is " + text::number(tie.sd_m) +
                            " m; a standard deviation is not negative"};
        tie.sd_m = std::max(tie.sd_m, 0.01);
        tie.label = m_label ? m_table.rows[i][*m_label] : "";
        if (tie.label.empty())
            tie.label = "tie " + std::to_string(m_survey.points.size() + 1);
        m_survey.points.push_back(tie);
    }

    void check() {
        for (std::size_t i = 1; i < m_survey.points.size(); ++i) {
            const TiePoint& a = m_survey.points[i - 1];
            const TiePoint& b = m_survey.points[i];
            if (b.fibre_m - a.fibre_m < 1e-6)
                throw DataError{b.place + ": fibre distance " + text::number(b.fibre_m) +
                                " m was given before (" + a.place + "); keep one of the two"};
        }
        if (m_survey.points.size() < 2)
            throw DataError{m_table.file.string() + ": holds " +
                            std::to_string(m_survey.points.size()) +
                            " tie points; at least two are needed to place a cable"};
        const auto without = std::count_if(m_survey.points.begin(), m_survey.points.end(),
                                           [](const TiePoint& tie) { return !tie.sd_said; });
        if (without > 0)
            m_survey.warnings.push_back(
                {"tie-default-sd", std::to_string(without) + " tie points have no sd_m; " +
                                       text::number(default_tie_sd_m) + " m was taken"});
    }

    const campaign::Placement& m_placement;
    record::Delimited m_table;
    Survey m_survey;
    Problems m_problems;
    CableMarks m_marks;
    std::optional<std::size_t> m_fibre, m_x, m_y, m_z, m_sd, m_label;
};

} // namespace

Survey read_survey(const campaign::Campaign& campaign) {
    if (campaign.placement->tie_points.empty())
        return {};
    return SurveyReader{*campaign.placement}.read();
}

} // namespace rillstrand::geo

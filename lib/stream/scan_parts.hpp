// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "stream/scan.hpp"

namespace rillstrand::stream {

/// Orthonormal columns of a fit and what they leave of a whitened profile.
class Basis {
public:
    explicit Basis(Eigen::VectorXd profile) : m_residual(std::move(profile)) {}
    /// @return false if the column lies within those there are, and is not taken
    bool add(const Eigen::VectorXd& column);
    /// The orthonormal column that was taken last.
    auto last() const { return m_columns.col(m_count - 1); }
    const Eigen::VectorXd& residual() const { return m_residual; }
    /// Squared length of a segment's part within the columns.
    double part2(Eigen::Index first, const Eigen::Ref<const Eigen::VectorXd>& segment) const;
    /// The segment's products with every column.
    Eigen::VectorXd parts(Eigen::Index first,
                          const Eigen::Ref<const Eigen::VectorXd>& segment) const;

private:
    Eigen::VectorXd m_residual;
    Eigen::MatrixXd m_columns;
    Eigen::Index m_count = 0;
};

/// Moves single pieces to where they fit best.
class LocalFit {
public:
    LocalFit(const Eigen::ArrayXd& place_m, const Whitener& whitener, double response_sd_m,
             const ScanLevels& levels)
        : m_place(place_m), m_whitener(whitener), m_response(response_sd_m), m_levels(levels) {}

    /// Whitened columns of one piece.
    std::vector<Eigen::VectorXd> columns(const Piece& piece) const;
    /// Gain of a piece beyond a fit; `value` and `value_sd` of its first column where asked for.
    double gain(const Piece& piece, const Basis& basis, double* value = nullptr,
                double* value_sd = nullptr, double* second = nullptr) const;
    /// The piece with its place, width and plume where they gain most.
    Piece improve(Piece piece, const Basis& basis) const;
    /// Sweeps over all pieces: each refined given the others, those that gain too little taken out,
    /// opposite steps joined to boxes.
    std::vector<Piece> settle(std::vector<Piece> pieces, const Eigen::VectorXd& white) const;

    /// What pieces leave of a profile, and what each must pay.
    double cost(const std::vector<Piece>& pieces, const Eigen::VectorXd& white) const;

private:
    double level(const Piece& piece, double value) const;
    Basis without(const std::vector<Piece>& pieces, std::size_t left_out,
                  const Eigen::VectorXd& white) const;
    void slide(Piece& piece, double Piece::*edge, double step_m, const Basis& basis) const;
    void tune_plume(Piece& piece, const Basis& basis) const;
    bool join_near(std::vector<Piece>& pieces, const Eigen::VectorXd& white) const;
    bool split_box(std::vector<Piece>& pieces, const Eigen::VectorXd& white) const;
    bool join_opposites(std::vector<Piece>& pieces, const Eigen::VectorXd& white) const;
    Eigen::Index first_channel(double place_m) const;

    const Eigen::ArrayXd& m_place;
    const Whitener& m_whitener;
    double m_response;
    ScanLevels m_levels;
};

} // namespace rillstrand::stream

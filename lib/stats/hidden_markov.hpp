// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Eigen/Core>

#include <functional>
#include <vector>

namespace rillstrand::stats {

/// A hidden Markov chain whose transitions and emissions may differ from step to step.
struct HiddenMarkov {
    Eigen::ArrayXd start; ///< probability of each state before the first emission, size n_state
    /// transition(t)(i, k): probability of state k at step t + 1 given state i at step t; rows sum
    /// to 1. Called with t = 0 … n_step - 2; what it returns must live until it is called again.
    std::function<const Eigen::MatrixXd&(Eigen::Index)> transition;
    /// Logarithm of the density of what was seen, row = step, column = state; any constant may be
    /// added to a row. Minus infinity: impossible. A row of equal values says nothing.
    Eigen::ArrayXXd log_emission;
};

/// What all that was seen, before and after, says of each step.
struct Smoothed {
    Eigen::ArrayXXd filtered;    ///< P(state | seen up to here), row = step, column = state
    Eigen::ArrayXXd probability; ///< P(state | everything seen), same shape
    double log_likelihood = 0.0; ///< of everything seen
    /// pair[t](i, k): P(state i at t and k at t + 1 | everything seen), size n_step - 1
    std::vector<Eigen::MatrixXd> pair;
};

/// Filtering and smoothing by the scaled forward-backward recursion; each row of emissions is
/// first brought to a greatest value of 1, so nothing over- or underflows.
///
/// @throws DataError if what was seen is impossible under the chain
/// Source: Rabiner (1989), Proc. IEEE 77, 257-286, doi:10.1109/5.18626.
Smoothed smooth(const HiddenMarkov& chain);

/// The most probable path of states, in logarithms throughout.
///
/// @throws DataError if what was seen is impossible under the chain
/// Source: Viterbi (1967), IEEE Trans. Inf. Theory 13, 260-269, doi:10.1109/TIT.1967.1054010.
std::vector<Eigen::Index> most_probable_path(const HiddenMarkov& chain);

} // namespace rillstrand::stats

// More than two windings: inductance matrix, coupling matrix, and whether they can be those of real coils.
#pragma once

#include <optional>
#include <utility>
#include <vector>

#include "analysis/coupling.h"
#include "analysis/measurement.h"

namespace coilassay {

/// Fits R_i, C_i and all L_ij (taken as symmetric) to an n-port sweep and adds the matrices; `not_positive_definite` when the
/// energy of some currents would be negative, with the pair that breaks it.
void add_matrices(Measurement& result, const Sweep& sweep, const CouplingRequest& request);

/// Adds matrices from anywhere, with the same judgement.
void judge_matrices(Measurement& result, InductanceMatrices matrices);

/// The same judgement of a coupling matrix from anywhere: smallest eigenvalue, and the pair whose coupling needs the least
/// change to make the matrix possible (none when it is, or when no single pair can).
struct CouplingMatrixJudgement {
  double smallest_eigenvalue = 0;
  std::optional<std::pair<std::size_t, std::size_t>> breaker;
  double nearest = 0;   // value of that coupling at which the matrix becomes possible
};
CouplingMatrixJudgement judge_coupling_matrix(const std::vector<std::vector<double>>& coupling);

}  // namespace coilassay

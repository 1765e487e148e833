// From a start to the least-squares solution on given blocks. Internal to this room.
#pragma once

#include <array>
#include <cmath>
#include <limits>

#include "fitting/damped_sine_equations.h"

namespace coilassay {

/// Limits of a shape: nothing faster than the samples, nothing that grows by more than e over the span.
struct ShapeLimits {
  double least_slow_decay = 0;
  double greatest_fast_decay = 0;
  bool allow(const Shape& shape) const;
};
ShapeLimits shape_limits(std::size_t samples);

template <int Modes>
struct Solution {
  Shapes<Modes> shapes;
  Equations<Modes> at;  // at.solvable is false when there is no solution
  double variance = 0;  // of one white value, from chi-square
  int iterations = 0;
  bool converged = false;
  double gain() const {
    return at.solvable ? at.offset_only - at.chi_square : -std::numeric_limits<double>::infinity();
  }
};

/// Levenberg-Marquardt on the shapes with the linear parameters always at their best (variable projection); steps are
/// damped relative to the diagonal. Converged when the next step is below 1e-4 standard uncertainties.
template <int Modes>
Solution<Modes> refine(const WhiteBlocks& blocks, const Shapes<Modes>& start, const ShapeLimits& limits);

/// (J^T J)^-1, or an empty matrix when the parameters are not all determined.
template <int Modes>
Eigen::MatrixXd inverse_normal(const Equations<Modes>& equations);

}  // namespace coilassay

// Normal equations of one or two damped sines on block sums. Internal to this room.
#pragma once

#include <Eigen/Core>
#include <array>
#include <vector>

#include "fitting/white_blocks.h"

namespace coilassay {

/// Shape of one mode: decay and squared angular frequency per sample.
struct Shape {
  double a = 0, q = 0;
  /// The slower of the two decays when overdamped, a itself otherwise.
  double slow_decay() const;
  double fast_decay() const;
  double omega() const;
};

/// e^{-an} C_q(n) and e^{-an} S_q(n), finite wherever the slow decay is.
struct DampedPair {
  double c = 0, s = 0;
};
DampedPair damped_pair(const Shape& shape, double n);
/// e^{-an} dS_q(n)/dq; dC_q/dq is -n S_q / 2.
double damped_sine_slope(const Shape& shape, double n, const DampedPair& at);

/// One shape per mode.
template <int Modes>
using Shapes = std::array<Shape, static_cast<std::size_t>(Modes)>;
/// p, s of each mode, then c relative to the reference of the blocks.
template <int Modes>
using Linear = Eigen::Matrix<double, 2 * Modes + 1, 1>;

/// Least squares with the linear parameters (p, s of each mode, c) already at their best for the given shapes.
template <int Modes>
struct Equations {
  static constexpr int kLinear = 2 * Modes + 1;
  static constexpr int kAll = 4 * Modes + 1;  // a, q, p, s of each mode, then c (relative to the reference)

  bool solvable = false;
  double chi_square = 0;   // of the white values
  double offset_only = 0;  // chi-square with c alone
  Linear<Modes> linear;
  Eigen::Matrix<double, kAll, kAll> normal;  // J^T J
  Eigen::Matrix<double, kAll, 1> gradient;   // J^T residual
  double model_energy = 0;                   // sum of the white model^2
};

/// With `derivatives` false only chi_square, offset_only and linear are filled (cheap: for searching starts).
template <int Modes>
Equations<Modes> equations(const WhiteBlocks& blocks, const Shapes<Modes>& shapes, bool derivatives = true);

/// Sum of model^2 over the samples of the present blocks and the tail, model relative to the reference.
template <int Modes>
double model_square(const WhiteBlocks& blocks, const Shapes<Modes>& shapes, const Linear<Modes>& linear);

/// White residuals (count x rank; 0 for a missing block).
template <int Modes>
std::vector<double> white_residuals(const WhiteBlocks& blocks, const Shapes<Modes>& shapes,
                                    const Linear<Modes>& linear);

}  // namespace coilassay

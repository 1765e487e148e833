// A sine in the whitened block sums of one channel: its columns, its linear solution, its slope over frequency. Internal
// to this room.
#pragma once

#include <Eigen/Core>
#include <complex>
#include <vector>

#include "fitting/white_blocks.h"

namespace coilassay {

/// Sum of e^{j theta m} over m < length, and its derivative by theta.
struct TurningSum {
  std::complex<double> value, slope;
};
TurningSum turning_sum(double theta, std::size_t length);

/// Amplitude, phase and offset of one channel at a given frequency, and what the frequency does.
struct SineSolution {
  Eigen::Vector3d linear = Eigen::Vector3d::Zero();    // re, im, offset (above the blocks' reference)
  Eigen::Matrix3d normal = Eigen::Matrix3d::Zero();    // of re, im, offset
  Eigen::Vector3d cross = Eigen::Vector3d::Zero();     // frequency column with those
  double slope_square = 0;                             // frequency column with itself
  double slope_residual = 0;                           // frequency column with what is left over
  double chi_square = 0;                               // what is left over
  bool solvable = false;

  std::complex<double> phasor() const { return {linear[0], linear[1]}; }
  /// Chi-square that the sine takes away beyond the offset.
  double sine_energy() const;
  /// Of the frequency column, what the linear ones cannot do.
  double own_slope_square() const;
};

/// Linear least squares of the blocks at `omega`, phasors at sample `centre`.
SineSolution solve_sine(const WhiteBlocks& blocks, double omega, double centre, bool with_slope);

/// Takes Re(amplitude e^{j omega (n - centre)}) out of the block values.
void subtract_sine(WhiteBlocks& blocks, double omega, double centre, std::complex<double> amplitude);

/// Frequency from the turning of the demodulated sums from block to block; needs full rank and omega within a third of a
/// turn per block.
double refined_omega(const WhiteBlocks& blocks);

}  // namespace coilassay

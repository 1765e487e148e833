// Where to begin: the strongest line of a record and how long it lasts. Internal to this room.
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "fitting/damped_sine_equations.h"
#include "fitting/short_sums.h"

namespace coilassay {

/// The stretch from the first sample in which one spectral line stands out most.
///
/// |sum (y - mean) e^{-i omega n}|^2 / length is what a rectangle matched to the decay would give: noise alone gives
/// sigma^2 times an exponential number at every length, a decay e^{-an} the most when the length is 1.26/a. The largest
/// over lengths 64, 256, ... therefore finds the frequency and the decay of a ringing that fills the record as well as
/// of one that ends in its first hundredth. (Of lengths nearly as good the longest is taken: it has the most cycles.)
struct StrongestLine {
  double omega = 0;        // rad per sample
  double omega_error = 0;  // scale of its error: a fraction of a bin
  std::size_t length = 0;  // samples in that stretch
  double cycles = 0;       // omega length / 2 pi: below about 6 the line is not to be trusted
  double strength = 0;     // the statistic above
  double floor = 0;        // its median over frequencies in the same stretch
};

/// The line, and what to look at for a first fit: averages of `decimation` samples from the first on. An average of a
/// damped sine over even blocks is a damped sine, so that fitting these is exact.
struct Beginning {
  StrongestLine line;
  std::size_t decimation = 1;
  std::vector<double> averages;  // empty when decimation is 1: the samples themselves
  ShortSums sums;                // what was read on the way, as sums over the longest short blocks
};

/// Slow lines are looked for on averages of 4, 16, ... samples, which costs one read of the record in all; when nothing
/// stands out, on up to 2^20 samples at full rate. Missing samples count as the mean.
Beginning find_beginning(std::span<const double> y, double reference = 0);

/// The same when the frequency is known: only how long it lasts is looked for.
Beginning beginning_near(std::span<const double> y, double omega, double reference);

/// Below this many cycles in its stretch the line is not to be trusted and slow shapes are tried one by one.
constexpr double kTrustedCycles = 6;

/// Shapes worth trying around the strongest line.
std::vector<Shape> starting_shapes(const StrongestLine& line);

}  // namespace coilassay

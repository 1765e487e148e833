// What the spectrum of a record says of its noise and of its sampling, whatever shape the signal has.
#pragma once

#include <cmath>
#include <span>

namespace coilassay {

/// Standard deviation of the white noise of a single sample.
///
/// Up to eight stretches of the record are tapered and transformed; the median power of a band is that of the noise
/// between the signal's lines, and the quieter bands of the quieter stretches count, so that lines, slow shapes and a
/// transient do not. Edges fill a whole spectrum: where few stretches are free of them, the median of third differences
/// decides, if it is smaller. Noise that a filter has taken away from the top of the spectrum is underestimated.
/// @return NaN for fewer than 32 samples in a row, or when nothing but steps changes.
double noise_of(std::span<const double> samples);

/// The strongest line of the last stretch of a record.
struct SpectralLine {
  double cycles_per_sample = std::nan("");  // within a bin
  double share = 0;                         // of the power about the mean, in the line
  double near_nyquist = 0;                  // share of the power above 0.8 of half the sampling rate
};
/// NaN and zeros for fewer than 64 samples in a row.
SpectralLine strongest_line(std::span<const double> samples);

}  // namespace coilassay

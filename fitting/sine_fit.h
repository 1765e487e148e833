// One frequency seen by one or several channels at once: y_c(n) = Re(A_c e^{j omega (n - centre)}) + offset_c.
#pragma once

#include <Eigen/Core>
#include <complex>
#include <cstddef>
#include <span>
#include <vector>

#include "base/result.h"
#include "fitting/fit.h"

namespace coilassay {

struct SineChannel {
  std::span<const double> y;         // evenly spaced, NaN = missing; all channels have the same length
  double resolution = std::nan("");  // step between codes, in units of y; NaN: not quantised or not known
};

/// What one channel shows of the common sine.
struct FittedSine {
  std::complex<double> phasor;   // at the centre of the record; the peak amplitude is its modulus
  double offset = 0;
  std::vector<std::complex<double>> harmonics;  // orders 2, 3, 4, 5 at the centre; beyond half the sampling rate 0
  double harmonic_u = 0;                        // standard uncertainty of their real and imaginary parts
  double sigma_per_sample = 0;   // scatter of single samples about sine and harmonics
  double sigma_in_band = 0;      // scatter the compressed data see, expressed per sample
  double sigma = 0;              // what the covariance uses: the larger, when larger beyond chance
  double dof = 0;                // of sigma
  std::size_t samples = 0;       // present and used
  bool undithered = false;       // noise below about 0.3 of the resolution: what rounding does is added, see fit_sines
  double snr() const { return std::norm(phasor) / (2 * sigma * sigma); }
};

struct SineFit {
  Fit fit;                       // omega, then (re, im, offset) of each channel in order; covariance of all of them
  double omega = 0;              // rad per sample
  double centre = 0;             // the sample the phasors refer to, (N - 1)/2
  double cycles = 0;             // in the record
  std::vector<FittedSine> channels;
};

struct SineFitOptions {
  double near_omega = std::nan("");  // frequency to begin at, rad per sample; NaN: found from the record
};

/// Fits one common frequency and, for each channel, amplitude, phase and offset by least squares (the seven parameters of
/// two channels, IEEE 1057 style), each channel weighted by its own noise.
///
/// The records are read once and compressed to whitened block sums; the fit is then as good as one of every sample
/// (variance within 1 % of the Cramer-Rao bound) from about 1.5 cycles up. The frequency refers to the centre of the
/// record, where it is uncorrelated with the phases. Harmonics 2 to 5 that stand out of the noise are taken out before
/// the fundamental is fitted: over a broken number of cycles they would lean on it.
///
/// Noise: the covariance is that of white noise of `sigma`. With a `resolution` that noise does not dither, rounding errs
/// by a function of the signal, and the mean square of what that does to the parameters over the unknown position of the
/// levels is added (fitting/rounding.h).
///
/// @return too_few_samples (fewer than 16 present in a channel); no_signal: no line above the noise in any channel, or
///         less than 0.7 of a cycle; not_converged.
Result<SineFit> fit_sines(std::span<const SineChannel> channels, const SineFitOptions& options = {});

/// Standard uncertainty of omega by the Cramer-Rao bound for many cycles, the root of
/// 24/(N (N^2 - 1) sum of A_c^2/sigma_c^2); that of each part of a phasor is sigma sqrt(2/N).
double sine_omega_bound(std::size_t samples, std::span<const double> amplitude, std::span<const double> sigma);

}  // namespace coilassay

// The ratio of two records at every frequency: averaged spectra of overlapping segments, coherence, random errors.
#pragma once

#include <complex>
#include <cstddef>
#include <span>
#include <vector>

namespace coilassay {

/// Averaged spectra of two records that were taken together, bins 0 .. segment/2; bin k is k/segment cycles per sample.
/// Scaled so that white noise of variance s has the power s in every bin.
struct TransferSpectra {
  std::size_t segment = 0;                  // samples
  std::size_t segments = 0;                 // that were averaged
  std::vector<double> xx, yy;               // mean of |X|², |Y|²
  std::vector<std::complex<double>> xy;     // mean of conj(X) Y
  /// Mean of |X|⁴ over the square of the mean of |X|²: 2 for noise, 1 for lines that stand still, as large as the number
  /// of segments for what comes by once.
  std::vector<double> restlessness;

  double coherence(std::size_t bin) const;              // |xy|²/(xx yy)
  /// Y/X with noise on y only (biased low, by xx/(xx + noise), when x is noisy).
  std::complex<double> h1(std::size_t bin) const { return xy[bin] / xx[bin]; }
  /// Y/X with noise on x only; the truth lies between the moduli of h1 and h2.
  std::complex<double> h2(std::size_t bin) const { return yy[bin] / std::conj(xy[bin]); }
  /// Independent averages that the overlapping segments are worth: neighbours of a Hann window at half overlap are
  /// correlated by 1/6, in power by 1/36.
  double averages() const;
};

/// Welch's method (IEEE Trans. Audio Electroacoust. 15 (1967) 70): segments with the Hann window, half overlapping, the mean
/// of each taken away. Segments with missing samples (NaN) are left out.
///
/// @param segment  even, at least 8 and at most the length of the records, which are equally long
TransferSpectra welch_spectra(std::span<const double> x, std::span<const double> y, std::size_t segment);

/// Relative standard uncertainty of the modulus of a ratio, and uncertainty of its phase in radian, from the coherence g:
/// sqrt((1 - g)/(2 g n)) (Bendat and Piersol, Random Data, 2nd ed., from memory). Infinite without coherence.
double random_error_of(double coherence, double averages);

/// Noise of the two records when it is white: variances per sample.
struct WhiteNoise {
  double x = 0, y = 0;
  double u_x = 0, u_y = 0;      // standard uncertainties
  bool told_apart = false;      // false: the bins cannot tell whose noise it is
  std::size_t used = 0;         // bins that agree with it
  double misfit = 0;            // their mean squared deviation by what chance leaves: 1 when the noise is white
};

/// What one common signal leaves over when both records have white noise, (1 - x/xx)(1 - y/yy) = g, over the given bins: least
/// squares with x, y not negative. It needs the ratio of the records to vary over frequency, which that of a coil does.
/// Bins that leave over more than the others say (leakage near a resonance or a steep edge) are not used.
WhiteNoise white_noise_of(const TransferSpectra& spectra, std::span<const std::size_t> bins);

}  // namespace coilassay

// Power spectra of real records (FFTW, ESTIMATE plans, one thread: the same bits every time).
#pragma once

#include <complex>
#include <span>
#include <vector>

namespace coilassay {

/// Discrete Fourier transform of real samples: n/2 + 1 bins, not normalised.
std::vector<std::complex<double>> fourier(std::span<const double> samples);

/// Power |X_k|^2 of the samples less their mean, bins 0 .. n/2.
std::vector<double> power_spectrum(std::span<const double> samples);

}  // namespace coilassay

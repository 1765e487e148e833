// Power spectra of real records (FFTW, ESTIMATE plans, one thread: the same bits every time).
#pragma once

#include <complex>
#include <cstddef>
#include <memory>
#include <span>
#include <vector>

namespace coilassay {

/// Discrete Fourier transform of real samples: n/2 + 1 bins, not normalised.
std::vector<std::complex<double>> fourier(std::span<const double> samples);

/// The same transform again and again, without new arrays: fill input(), then run(). Its arrays are aligned, which is twice
/// as fast as fourier(); the results differ by rounding.
class RepeatedFourier {
 public:
  explicit RepeatedFourier(std::size_t samples);
  ~RepeatedFourier();
  RepeatedFourier(const RepeatedFourier&) = delete;
  RepeatedFourier& operator=(const RepeatedFourier&) = delete;
  std::span<double> input();
  std::span<const std::complex<double>> run();

 private:
  struct State;
  std::unique_ptr<State> state_;
};

/// Power |X_k|^2 of the samples less their mean, bins 0 .. n/2.
std::vector<double> power_spectrum(std::span<const double> samples);

}  // namespace coilassay

// A long record in few numbers: sums over blocks of samples, plain and demodulated, in one read of the array.
#pragma once

#include <complex>
#include <cstddef>
#include <span>
#include <vector>

namespace coilassay {

/// Sums over `count` blocks of `length` samples, m counted from 0 within each block and r = `reference`:
/// sum = S(v - r), square = S(v - r)^2, demodulated = S(v - r) e^{-i omega m}. A block that holds a NaN has NaN sums.
struct BlockSums {
  std::size_t length = 0;
  double omega = 0;  // rad per sample; 0: no demodulation
  double reference = 0;
  std::vector<double> sum;
  std::vector<double> square;
  std::vector<std::complex<double>> demodulated;  // empty when omega is 0
};

/// One read of y[0, length * count). Accurate to rounding (lanes of partial sums, phase reseeded every 512 samples);
/// the same bits on every x86-64 processor, with or without AVX2.
BlockSums block_sums(std::span<const double> y, std::size_t length, std::size_t count, double omega, double reference);

/// Sum and count of what is present.
struct PresentSum {
  double sum = 0;
  double square = 0;
  std::size_t count = 0;
};
PresentSum present_sum(std::span<const double> y, double reference);

}  // namespace coilassay

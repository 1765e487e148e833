// Single samples against a fitted sine: its scatter and harmonics, from some of the record. Internal to this room.
#pragma once

#include <complex>
#include <cstddef>
#include <span>
#include <vector>

namespace coilassay {

struct SampleLook {
  std::vector<std::complex<double>> harmonics;  // orders 2, 3, 4, 5 at the centre; beyond half the sampling rate 0
  double harmonic_u = 0;                        // standard uncertainty of their parts
  double sigma = 0;                             // scatter of single samples about all of them
  double dof = 0;
  std::size_t present = 0;                      // samples looked at
};

/// Fundamental, harmonics and offset at a known frequency by linear least squares: on all samples of a record that is short
/// or has few cycles (there harmonics lean on the fundamental, and must be known as well), otherwise on 16384 in stretches
/// spread over it. With fewer than 1.5 cycles no harmonics are told apart.
/// @param reference  about the offset
SampleLook look_at_samples(std::span<const double> y, double omega, double centre, double reference);

}  // namespace coilassay

// Single samples against a fitted sine: its scatter and harmonics, from some of the record. Internal to this room.
#pragma once

#include <complex>
#include <cstddef>
#include <span>
#include <vector>

namespace coilassay {

struct SampleLook {
  std::vector<std::complex<double>> harmonics;  // orders 2, 3, 4, 5 at the centre; beyond half the sampling rate 0
  std::complex<double> fundamental;             // fitted beside them
  double harmonic_u = 0;                        // standard uncertainty of their parts
  double sigma = 0;                             // scatter of single samples about all of them
  double dof = 0;
  std::size_t present = 0;                      // samples looked at
};

/// Fundamental, harmonics and offset at a known frequency by linear least squares on at most 65536 samples, all of a
/// shorter record, otherwise in stretches spread over it. Harmonics that the stretch cannot tell apart (fewer than two
/// cycles) are left out.
SampleLook look_at_samples(std::span<const double> y, double omega, double centre, std::complex<double> phasor, double offset);

}  // namespace coilassay

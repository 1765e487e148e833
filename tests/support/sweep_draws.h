// Sweeps of R, L, C, parallel loss, skin loss and a relaxation over a broad range of coils, made by a formula of their own.
#pragma once

#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

#include "base/random.h"

namespace coilassay::test {

struct SweepTruth {
  double r = 0, l = 0, c = 0, g = 0, skin = 0;   // g: parallel; skin: at the reference frequency
  double share = 0, corner_hz = 1;               // of l, with a resistance across it that ends its work beyond the corner
  double low_hz = 0, high_hz = 0;
  double reference_hz() const { return std::sqrt(low_hz * high_hz); }
  double resonance_hz() const { return 1 / (2 * std::numbers::pi * std::sqrt(l * c)); }
};

inline std::complex<double> impedance_of(const SweepTruth& t, double f) {
  const double w = 2 * std::numbers::pi * f;
  const std::complex<double> j(0, 1);
  const std::complex<double> series = t.r + (1.0 + j) * t.skin * std::sqrt(f / t.reference_hz()) + j * w * t.l * (1 - t.share) +
                                      j * w * t.l * t.share / (1.0 + j * f / t.corner_hz);
  return 1.0 / (1.0 / series + j * w * t.c + t.g);
}

/// L 10 nH to 10 H, R 1 mohm to 1 kohm, C 0.1 pF to 1 nF, start 20 Hz to 100 kHz, 2 to 5 decades, resonance from 3 times the
/// start to 10 times the stop; the inductance must show in the span. 4 elements: parallel loss, 5: skin loss too.
inline SweepTruth draw_sweep(Random& random, int elements) {
  const auto between = [&](double a, double b) { return a * std::pow(b / a, random.uniform()); };
  while (true) {
    SweepTruth t;
    t.r = between(1e-3, 1e3);
    t.l = between(1e-8, 10);
    t.c = between(1e-13, 1e-9);
    const double g = 1 / (std::sqrt(t.l / t.c) * between(1, 300)), skin = t.r * between(0.05, 3);
    t.g = elements > 3 ? g : 0;
    t.skin = elements > 4 ? skin : 0;
    t.low_hz = between(20, 1e5);
    t.high_hz = t.low_hz * between(1e2, 1e5);
    const double resonance = t.resonance_hz(), shown = std::fmin(t.high_hz, resonance);
    const double r = t.r + t.skin * std::sqrt(shown / t.reference_hz());
    if (2 * std::numbers::pi * shown * t.l > r && 3 * t.low_hz < resonance && resonance < 10 * t.high_hz && t.high_hz < 3e9) return t;
  }
}

struct MadeSweep {
  std::vector<double> f;
  std::vector<std::complex<double>> z;
};

/// `points` evenly spread over the logarithm of the frequency, each z times 1 + relative (normal, both parts).
inline MadeSweep make_sweep(const SweepTruth& t, int points, double relative, Random& random) {
  MadeSweep sweep;
  for (int i = 0; i < points; ++i) {
    const double f = t.low_hz * std::pow(t.high_hz / t.low_hz, i / (points - 1.0));
    const double a = random.normal(), b = random.normal();
    sweep.f.push_back(f);
    sweep.z.push_back(impedance_of(t, f) * std::complex<double>(1 + relative * a, relative * b));
  }
  return sweep;
}

/// The same with errors `u` of the real and the imaginary part of S about 50 ohm.
inline MadeSweep make_reflection_sweep(const SweepTruth& t, int points, double u, Random& random) {
  MadeSweep sweep = make_sweep(t, points, 0, random);
  for (std::complex<double>& z : sweep.z) {
    const double a = random.normal(), b = random.normal();
    const std::complex<double> s = (z - 50.0) / (z + 50.0) + u * std::complex<double>(a, b);
    z = 50.0 * (1.0 + s) / (1.0 - s);
  }
  return sweep;
}

}  // namespace coilassay::test

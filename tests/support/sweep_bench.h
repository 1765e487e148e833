// Simulated sweeps for tests and proofs, with every stated error drawn from its law.
#pragma once

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

#include "acquire/synthetic/coil_sweep.h"
#include "analysis/sweep.h"
#include "base/random.h"

namespace coilassay::test {

/// A coil of a usual kind: 1 uH to 10 mH, resonance 1 to 30 MHz, Q 5 to 100 at a tenth of it, with or without skin effect and
/// parallel loss, a span of 2.5 to 4.5 decades that may or may not reach the resonance.
inline synthetic::CoilSweepBench draw_coil(Random& random, double noise) {
  const auto between = [&](double a, double b) { return a * std::pow(b / a, random.uniform()); };
  synthetic::CoilSweepBench b;
  b.inductance_h = between(1e-6, 1e-2);
  const double f_r = between(1e6, 3e7), w_r = 2 * std::numbers::pi * f_r;
  b.parallel_capacitance_f = 1 / (w_r * w_r * b.inductance_h);
  const double reactance = 0.1 * w_r * b.inductance_h;
  b.resistance_ohm = reactance / between(20, 500);
  b.skin_frequency_hz = 0.1 * f_r;
  b.skin_ohm = random.uniform() < 0.6 ? reactance / between(5, 1000) : 0;   // some far too small to be seen
  b.parallel_resistance_ohm = random.uniform() < 0.6 ? 10 * reactance * between(3, 300) : 0;
  b.stop_hz = f_r * between(0.2, 10);
  b.start_hz = std::fmax(b.stop_hz * std::pow(10, -random.uniform(2.5, 4.5)), 20);
  b.points = 201;
  b.noise_ratio = noise;
  return b;
}

/// What the analyser of a trial is off by: constant, wandering and scattered parts as docs/uncertainty.md has them.
struct DrawnErrors {
  std::complex<double> constant = 0;
  std::vector<std::complex<double>> nodes;
  std::vector<std::complex<double>> points;
  double frequency = 0;
};

inline DrawnErrors draw_errors(Random& random, double accuracy, double frequency, const synthetic::CoilSweepBench& b) {
  DrawnErrors errors;
  const auto part = [&] { return random.uniform(-1, 1); };
  errors.constant = accuracy * std::complex<double>(part(), part());
  const auto nodes = static_cast<std::size_t>(std::fmax(1, std::round(std::log10(b.stop_hz / b.start_hz)))) + 1;
  for (std::size_t k = 0; k < nodes; ++k) errors.nodes.push_back(accuracy / 2 * std::complex<double>(part(), part()));
  for (std::size_t i = 0; i < b.points; ++i) errors.points.push_back(accuracy / 10 * std::complex<double>(part(), part()));
  errors.frequency = frequency * part();
  return errors;
}

/// The sweep as that analyser writes it: noise of the bench on top.
inline Sweep seen_with(const DrawnErrors& errors, const synthetic::CoilSweepBench& b) {
  Sweep sweep = synthetic::simulate_coil_sweep(b)->sweep;
  const double span = std::log(b.stop_hz / b.start_hz);
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    const double f = sweep.frequency_hz[i];
    const double at = std::log(f / b.start_hz) / span * static_cast<double>(errors.nodes.size() - 1);
    const auto k = std::min(static_cast<std::size_t>(std::fmax(at, 0)), errors.nodes.size() - 2);
    const double t = at - static_cast<double>(k);
    const std::complex<double> ratio = 1.0 + errors.constant + (1 - t) * errors.nodes[k] + t * errors.nodes[k + 1] + errors.points[i];
    sweep.z_ohm[i][0] *= ratio * synthetic::coil_impedance(b, f * (1 + errors.frequency)) / synthetic::coil_impedance(b, f);
  }
  return sweep;
}

}  // namespace coilassay::test

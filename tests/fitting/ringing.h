// Records for the tests of the damped sine: truth by libm or by stepping, never by the code under test.
#pragma once

#include <cmath>
#include <cstdint>
#include <vector>

#include "base/random.h"
#include "fitting/damped_sine.h"

namespace coilassay::test {

struct Ringing {
  double a = 6e-4;        // per sample
  double omega0 = 0.012;  // natural, rad per sample; below a: overdamped
  double phase = 0.7;     // at or below critical damping the decay starts with level 1 and slope 0 instead
  double offset = 0.03;
  double sigma = 0.01;
  std::size_t samples = 10000;

  double q() const { return omega0 * omega0 - a * a; }
  static Ringing of(double quality, double snr_db, std::size_t samples, double time_constants = 6) {
    Ringing r;
    r.a = time_constants / static_cast<double>(samples);
    r.omega0 = 2 * quality * r.a;
    if (r.omega0 > 2.6) {
      r.omega0 = 2.6;
      r.a = r.omega0 / (2 * quality);
    }
    r.sigma = 1 / std::sqrt(2 * std::pow(10, snr_db / 10));  // SNR = A^2 / (2 sigma^2), A = 1
    r.samples = samples;
    return r;
  }
  double quality() const { return omega0 / (2 * a); }

  /// Truth in the parameters of the fit.
  DampedSine truth() const {
    DampedSine m{a, q(), 1, a, offset};
    if (quality() >= 0.6) {
      m.p = std::cos(phase);
      m.s = -std::sin(phase) * std::sqrt(q());
    }
    return m;
  }

  /// Level without noise, by libm.
  double level(double n) const {
    if (quality() >= 0.6) return std::exp(-a * n) * std::cos(std::sqrt(q()) * n + phase) + offset;
    if (q() > 0) {
      const double w = std::sqrt(q());
      return std::exp(-a * n) * (std::cos(w * n) + a * std::sin(w * n) / w) + offset;
    }
    if (q() == 0) return std::exp(-a * n) * (1 + a * n) + offset;
    const double r = std::sqrt(-q());
    return ((1 + a / r) * std::exp(-(a - r) * n) + (1 - a / r) * std::exp(-(a + r) * n)) / 2 + offset;
  }

  std::vector<double> levels() const {
    std::vector<double> y(samples);
    for (std::size_t i = 0; i < samples; ++i) y[i] = level(static_cast<double>(i));
    return y;
  }
  std::vector<double> record(std::uint64_t seed) const {
    Random random(seed, 17);
    std::vector<double> y = levels();
    for (double& v : y) v += sigma * random.normal();
    return y;
  }
};

/// As a converter with steps of `step` would give it.
inline std::vector<double> rounded(std::vector<double> y, double step) {
  for (double& v : y) v = std::round(v / step) * step;
  return y;
}

}  // namespace coilassay::test

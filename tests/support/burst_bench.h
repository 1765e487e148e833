// Simulated bursts for tests, made into sweeps the way the program does, beside the impedance written down.
#pragma once

#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <numbers>
#include <span>

#include "acquire/synthetic/driven_burst.h"
#include "analysis/waveform_sweep.h"

namespace coilassay::test {

inline synthetic::DrivenBurstRecord simulated_burst(const synthetic::DrivenBurstBench& bench) {
  Result<synthetic::DrivenBurstRecord> record = synthetic::simulate_driven_burst(bench);
  EXPECT_TRUE(record) << (record ? "" : record.error().finding);
  return std::move(*record);
}

inline std::complex<double> burst_impedance(const synthetic::DrivenBurstBench& b, double f) {
  const double w = 2 * std::numbers::pi * f, leak = b.parallel_resistance_ohm > 0 ? 1 / b.parallel_resistance_ohm : 0;
  return 1.0 / (1.0 / std::complex(b.resistance_ohm, w * b.inductance_h) + std::complex(leak, w * b.parallel_capacitance_f));
}

/// A request that states exactly what the bench has in its current channel, without tolerance.
inline WaveformRequest exact_burst_request(const synthetic::DrivenBurstBench& bench) {
  WaveformRequest request;
  request.propagation.exact_bench = true;
  ChannelSetup& current = request.bench.current;
  if (bench.shunt_ohm > 0) {
    current.shunt = StatedValue::exact(bench.shunt_ohm, Unit::ohm);
    current.shunt_inductance = StatedValue::exact(bench.shunt_inductance_h, Unit::henry);
  }
  current.skew = StatedValue::exact(bench.skew_s, Unit::second);
  return request;
}

inline WaveformSweep swept(const Capture& capture, const WaveformRequest& request) {
  Result<WaveformSweep> result = sweep_of_waveforms({&capture, 1}, request);
  EXPECT_TRUE(result) << (result ? "" : result.error().finding);
  return result ? std::move(*result) : WaveformSweep{};
}

/// Sums of (error/u)² over both components: by the random error alone, and with what moves all points added to it.
struct BarCheck {
  double random = 0, all = 0, count = 0, worst = 0;
  void add(const WaveformSweep& w, const synthetic::DrivenBurstBench& bench) {
    if (!w.sweep) return;
    for (std::size_t i = 0; i < w.sweep->frequency_hz.size(); ++i) {
      const std::complex<double> z = w.sweep->z_ohm[i][0];
      const double square = std::norm(z / burst_impedance(bench, w.sweep->frequency_hz[i]) - 1.0);
      double u2 = 2 * w.knowledge.u_ratio[i] * w.knowledge.u_ratio[i];
      random += square / u2;
      for (const ImpedanceErrorTerm& term : w.knowledge.errors) u2 += std::norm(term.dz_ohm[i] / z);
      all += square / u2;
      worst = std::fmax(worst, std::sqrt(square));
      count += 1;
    }
  }
  double random_ratio() const { return std::sqrt(random / count); }
  double ratio() const { return std::sqrt(all / count); }
};

}  // namespace coilassay::test

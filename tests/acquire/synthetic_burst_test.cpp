// The stepped circuit against the impedance written down in the frequency domain.
#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <numbers>

#include "acquire/synthetic/driven_burst.h"

namespace coilassay::synthetic {
namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;

DrivenBurstRecord simulated(const DrivenBurstBench& bench) {
  Result<DrivenBurstRecord> record = simulate_driven_burst(bench);
  EXPECT_TRUE(record) << (record ? "" : record.error().finding);
  return std::move(*record);
}

Complex impedance(const DrivenBurstBench& b, double f) {
  const double w = kTwoPi * f;
  const double leak = b.parallel_resistance_ohm > 0 ? 1 / b.parallel_resistance_ohm : 0;
  return 1.0 / (1.0 / Complex(b.resistance_ohm, w * b.inductance_h) + Complex(leak, w * b.parallel_capacitance_f));
}

/// One line of the discrete Fourier transform, summed as it is defined.
Complex line(const std::vector<double>& samples, std::size_t k) {
  Complex sum = 0;
  for (std::size_t n = 0; n < samples.size(); ++n) {
    sum += samples[n] * std::polar(1.0, -kTwoPi * static_cast<double>(k * n % samples.size()) / static_cast<double>(samples.size()));
  }
  return sum;
}

Complex ratio(const DrivenBurstRecord& r, std::size_t k) {
  return line(r.capture.channels[0].samples, k) / line(r.capture.channels[1].samples, k);
}

TEST(SimulatedBurst, APulseThatEndsInsideTheRecordShowsTheImpedance) {
  DrivenBurstBench b;
  b.parallel_resistance_ohm = 20e3;
  b.rise_s = 0.2e-6;   // smooth enough for samples of 10 ns: what lies beyond 50 MHz and folds back is below 1e-4
  const DrivenBurstRecord r = simulated(b);
  for (const std::size_t k : {10u, 40u, 100u, 250u, 330u}) {   // 50 kHz to 1.65 MHz
    const Complex truth = impedance(b, static_cast<double>(k) / 200e-6);
    EXPECT_LT(std::abs(ratio(r, k) / truth - 1.0), 2e-4) << k;
  }
  EXPECT_NEAR(r.truth.f_r_hz, 5.0329e6, 1e3);
}

TEST(SimulatedBurst, AChirpBetweenQuietEndsShowsTheImpedance) {
  DrivenBurstBench b;
  b.kind = BurstKind::chirp;
  const DrivenBurstRecord r = simulated(b);
  for (const std::size_t k : {10u, 100u, 500u, 900u}) {
    const Complex truth = impedance(b, static_cast<double>(k) / 200e-6);
    EXPECT_LT(std::abs(ratio(r, k) / truth - 1.0), 2e-4) << k;
  }
}

TEST(SimulatedBurst, SkewAndShuntInductanceAreInTheCurrentChannel) {
  DrivenBurstBench b;
  b.rise_s = 0.2e-6;
  b.shunt_ohm = 0.5;
  b.shunt_inductance_h = 5e-9;
  for (const double skew : {4.3e-9, -7.7e-9}) {
    b.skew_s = skew;
    const DrivenBurstRecord r = simulated(b);
    for (const std::size_t k : {40u, 200u}) {
      const double f = static_cast<double>(k) / 200e-6, w = kTwoPi * f;
      const Complex chain = Complex(0.5, w * 5e-9) * std::polar(1.0, -w * skew);
      EXPECT_LT(std::abs(ratio(r, k) * chain / impedance(b, f) - 1.0), 2e-4) << k;
    }
  }
}

TEST(SimulatedBurst, NoiseHasTheBandThatWasAskedFor) {
  DrivenBurstBench b;
  b.kind = BurstKind::noise;
  b.source_ohm = 1e-3;   // the voltage is the source's
  b.samples = 40000;
  const DrivenBurstRecord r = simulated(b);
  const auto& v = r.capture.channels[0].samples;
  double sum = 0;
  for (const double x : v) sum += x * x;
  EXPECT_NEAR(std::sqrt(sum / 40000), 5, 0.3);   // 400 us of 5 MHz: some 4000 degrees of freedom, the high pass takes 0.5 %
  const auto power = [&](std::size_t from) {
    double p = 0;
    for (std::size_t k = from; k < from + 40; ++k) p += std::norm(line(v, k)) / 40;
    return p;
  };
  const double inside = power(400), beyond = power(8000);   // 1 MHz, 20 MHz: four poles, (1/4)^8, and the source.s own two there, 1/4
  EXPECT_NEAR(std::log2(beyond / inside), -18, 1);
}

TEST(SimulatedBurst, TheSameBenchGivesTheSameBytesAndAnotherSeedOthers) {
  DrivenBurstBench b;
  b.kind = BurstKind::noise;
  b.bits = 8;
  b.voltage_noise_v = 0.01;
  const std::string first = simulated(b).capture.source.sha256;
  EXPECT_EQ(simulated(b).capture.source.sha256, first);
  b.seed = 2;
  EXPECT_NE(simulated(b).capture.source.sha256, first);
}

TEST(SimulatedBurst, ImpossibleBenchesAreRefusedInASentence) {
  DrivenBurstBench b;
  b.parallel_capacitance_f = 0;
  EXPECT_EQ(simulate_driven_burst(b).error().finding, "the parallel capacitance is 0, which no bench can have");
  b = {};
  b.kind = BurstKind::chirp;
  b.to_hz = 60e6;
  EXPECT_EQ(simulate_driven_burst(b).error().finding, "the samples are too far apart for the highest frequency");
  b = {};
  b.width_s = 1;
  EXPECT_EQ(simulate_driven_burst(b).error().problem, Problem::bad_number);
}

}  // namespace
}  // namespace coilassay::synthetic

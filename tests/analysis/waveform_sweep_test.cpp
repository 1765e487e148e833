// Sweeps from pulses, chirps and noise, against the circuit written down.
#include "analysis/waveform_sweep.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "tests/support/burst_bench.h"

namespace coilassay {
namespace {

using synthetic::BurstKind;
using synthetic::DrivenBurstBench;
using test::BarCheck;
using test::exact_burst_request;
using test::simulated_burst;
using test::swept;

const Finding* finding(const WaveformSweep& w, const std::string& code) {
  for (const Finding& f : w.findings) {
    if (f.code == code) return &f;
  }
  return nullptr;
}

DrivenBurstBench noisy(BurstKind kind, double volts, double amps) {
  DrivenBurstBench b;
  b.kind = kind;
  b.parallel_resistance_ohm = 20e3;
  b.voltage_noise_v = volts;
  b.current_noise_a = amps;
  if (kind == BurstKind::noise) b.samples = 100000;
  return b;
}

// Fixed seeds; the full size is tests/proof/waveform_error_bars. Some thousand points of ten records: 2 to 3 % by chance.
TEST(WaveformSweep, ErrorBarsAreTrueForPulsesChirpsAndNoise) {
  for (const auto& [kind, volts, amps] : {std::tuple{BurstKind::pulse, 5e-3, 2e-5}, std::tuple{BurstKind::chirp, 1e-2, 1e-4},
                                          std::tuple{BurstKind::noise, 1e-2, 1e-4}, std::tuple{BurstKind::noise, 2e-2, 0.0}}) {
    BarCheck check;
    for (std::uint64_t seed = 1; seed <= 10; ++seed) {
      DrivenBurstBench b = noisy(kind, volts, amps);
      b.seed = seed;
      const WaveformSweep w = swept(simulated_burst(b).capture, exact_burst_request(b));
      ASSERT_TRUE(w.sweep);
      EXPECT_EQ(w.method, kind == BurstKind::noise ? "averaged segments" : "whole record");
      check.add(w, b);
    }
    EXPECT_GT(check.count, 1000);
    EXPECT_NEAR(check.ratio(), 1, 0.1) << static_cast<int>(kind);
  }
}

TEST(WaveformSweep, AChirpThatIsCutIsRefusedAndSaysWhy) {
  DrivenBurstBench b = noisy(BurstKind::chirp, 1e-2, 1e-4);
  b.filled = 1;
  b.samples = 100000;
  const WaveformSweep w = swept(simulated_burst(b).capture, exact_burst_request(b));
  EXPECT_FALSE(w.sweep);
  ASSERT_NE(finding(w, "burst_cut"), nullptr);
  EXPECT_EQ(finding(w, "burst_cut")->severity, Severity::refusal);
}

TEST(WaveformSweep, TheBandWithEnergyIsSaid) {
  DrivenBurstBench b = noisy(BurstKind::chirp, 3e-2, 3e-4);
  b.from_hz = 200e3;
  b.to_hz = 2e6;
  const WaveformSweep w = swept(simulated_burst(b).capture, exact_burst_request(b));
  ASSERT_TRUE(w.sweep);
  EXPECT_GT(w.low_hz, 50e3);      // the skirts of a chirp fade slowly, and at low frequency the current is large
  EXPECT_LT(w.low_hz, 220e3);
  EXPECT_NEAR(w.high_hz, 2e6, 0.2e6);
  EXPECT_NE(finding(w, "excitation_band"), nullptr);
}

TEST(WaveformSweep, SeveralPulsesInOneRecordOrInManyKnowMore) {
  DrivenBurstBench b = noisy(BurstKind::pulse, 5e-3, 2e-5);
  const WaveformSweep one = swept(simulated_burst(b).capture, exact_burst_request(b));
  std::vector<Capture> captures;
  for (std::uint64_t seed = 1; seed <= 8; ++seed) {
    b.seed = seed;
    captures.push_back(simulated_burst(b).capture);
  }
  const auto many = sweep_of_waveforms(captures, exact_burst_request(b));
  ASSERT_TRUE(one.sweep && many && many->sweep);
  BarCheck check;
  check.add(*many, b);
  EXPECT_NEAR(check.ratio(), 1, 0.2);     // one draw
  EXPECT_LT(check.worst, 0.7);
  // The same frequency, a third of the error: a root of eight.
  const auto u_at = [](const WaveformSweep& w, double f) {
    std::size_t best = 0;
    for (std::size_t i = 0; i < w.sweep->frequency_hz.size(); ++i) {
      if (std::fabs(w.sweep->frequency_hz[i] - f) < std::fabs(w.sweep->frequency_hz[best] - f)) best = i;
    }
    return w.knowledge.u_ratio[best];
  };
  EXPECT_NEAR(u_at(one, 1e6) / u_at(*many, 1e6), std::sqrt(8.0), 0.4);

  b.seed = 1;
  b.pulses = 8;
  const WaveformSweep train = swept(simulated_burst(b).capture, exact_burst_request(b));
  ASSERT_TRUE(train.sweep);
  BarCheck in_train;
  in_train.add(train, b);
  EXPECT_NEAR(in_train.ratio(), 1, 0.15);
}

TEST(WaveformSweep, ShuntAndSkewAreTakenOutAndAreErrorsOfAllPoints) {
  DrivenBurstBench b = noisy(BurstKind::pulse, 1e-3, 1e-5);
  b.shunt_ohm = 0.5;
  b.shunt_inductance_h = 5e-9;
  b.skew_s = 4e-9;
  WaveformRequest request = exact_burst_request(b);
  const WaveformSweep exact = swept(simulated_burst(b).capture, request);
  ASSERT_TRUE(exact.sweep);
  BarCheck check;
  check.add(exact, b);
  EXPECT_NEAR(check.ratio(), 1, 0.15);
  request.bench.current.skew = StatedValue::normal(4e-9, 1e-9, Unit::second);
  request.bench.current.shunt = StatedValue::rectangular(0.5, 0.005, Unit::ohm);
  const WaveformSweep stated = swept(simulated_burst(b).capture, request);
  std::vector<std::string> sources;
  for (const ImpedanceErrorTerm& term : stated.knowledge.errors) sources.push_back(term.source);
  EXPECT_THAT(sources, testing::IsSupersetOf({"skew", "shunt"}));
  for (const ImpedanceErrorTerm& term : stated.knowledge.errors) {
    for (std::size_t i = 0; i < stated.sweep->frequency_hz.size(); ++i) {
      const double share = std::abs(term.dz_ohm[i] / stated.sweep->z_ohm[i][0]);
      if (term.source == "shunt") {
        EXPECT_NEAR(share, 0.01 / std::sqrt(3.0), 1e-9);
      }
      if (term.source == "skew") {
        const double angle = 2 * std::numbers::pi * stated.sweep->frequency_hz[i] * 1e-9;
        EXPECT_NEAR(share, 2 * std::sin(angle / 2), 1e-9);
      }
    }
  }
}

TEST(WaveformSweep, SharpEdgesACutTailAndClippingAreFound) {
  DrivenBurstBench b = noisy(BurstKind::pulse, 1e-4, 1e-6);
  b.rise_s = 10e-9;
  const WaveformSweep sharp = swept(simulated_burst(b).capture, exact_burst_request(b));
  EXPECT_NE(finding(sharp, "sharp_edges"), nullptr);
  BarCheck check;
  check.add(sharp, b);
  EXPECT_LT(check.ratio(), 1.1);

  b = noisy(BurstKind::pulse, 1e-4, 1e-6);
  b.source_ohm = 5;   // L/R of 18 us: a little is left after 40 us
  b.samples = 8000;
  const WaveformSweep tail = swept(simulated_burst(b).capture, exact_burst_request(b));
  ASSERT_NE(finding(tail, "tail_cut"), nullptr);
  BarCheck with_tail;
  with_tail.add(tail, b);
  EXPECT_LT(with_tail.ratio(), 1.2);

  b.samples = 3000;
  const WaveformSweep cut = swept(simulated_burst(b).capture, exact_burst_request(b));
  EXPECT_FALSE(cut.sweep);
  EXPECT_NE(finding(cut, "burst_cut"), nullptr);

  b = noisy(BurstKind::pulse, 1e-4, 1e-6);
  b.source_ohm = 0.01;   // L/R of 0.2 ms: the current stays
  const WaveformSweep charged = swept(simulated_burst(b).capture, exact_burst_request(b));
  EXPECT_FALSE(charged.sweep);
  ASSERT_NE(finding(charged, "burst_cut"), nullptr);
  EXPECT_THAT(finding(charged, "burst_cut")->message, testing::HasSubstr("the coil is not discharged"));

  b = noisy(BurstKind::pulse, 1e-3, 1e-5);
  b.bits = 12;
  b.current_full_scale_a = 0.01;
  const WaveformSweep clipped = swept(simulated_burst(b).capture, exact_burst_request(b));
  EXPECT_FALSE(clipped.sweep);
  EXPECT_NE(finding(clipped, "clipped"), nullptr);
}

TEST(WaveformSweep, UnlikeCapturesAndShortRecordsAreRefused) {
  DrivenBurstBench b = noisy(BurstKind::pulse, 1e-3, 1e-5);
  std::vector<Capture> captures{simulated_burst(b).capture};
  b.samples = 10000;
  captures.push_back(simulated_burst(b).capture);
  EXPECT_EQ(sweep_of_waveforms(captures, exact_burst_request(b)).error().problem, Problem::usage);
  WaveformRequest request = exact_burst_request(b);
  request.from_s = 0;
  request.to_s = 1e-6;
  const WaveformSweep w = swept(captures[1], request);
  EXPECT_FALSE(w.sweep);
  EXPECT_NE(finding(w, "too_few_samples"), nullptr);
}

}  // namespace
}  // namespace coilassay

// What a careful colleague would notice about a steady sine: each planted and found, and silence on clean captures.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/sine.h"
#include "base/random.h"
#include "tests/support/sine_bench.h"

namespace coilassay {
namespace {

using synthetic::DrivenSineBench;
using test::exact_sine_request;
using test::measured_sine;
using test::simulated_sine;
using testing::HasSubstr;

const Finding* finding(const Measurement& m, std::string_view code) {
  for (const Finding& f : m.findings) {
    if (f.code == code) return &f;
  }
  return nullptr;
}

const Bound* bound(const Measurement& m, std::string_view symbol) {
  for (const Bound& b : m.bounds) {
    if (b.symbol == symbol) return &b;
  }
  return nullptr;
}

DrivenSineBench noisy() {
  DrivenSineBench bench;
  bench.voltage_noise_v = 1e-3;
  bench.current_noise_a = 2e-5;
  return bench;
}

TEST(SineFindings, SkewLimitedPrintsTheCeilingOfQ) {
  const DrivenSineBench bench = noisy();
  SineRequest request = exact_sine_request(bench);
  request.bench.current.skew = StatedValue::rectangular(0, 100e-9, Unit::second);
  const Measurement m = measured_sine(simulated_sine(bench).capture, request);
  const Finding* f = finding(m, "skew_limited");
  ASSERT_NE(f, nullptr);
  EXPECT_EQ(f->severity, Severity::caution);
  EXPECT_NEAR(f->figure, 0.1 / (2 * std::numbers::pi * 10e3 * 100e-9 / std::sqrt(3.0)), 0.5);
  EXPECT_THAT(f->message, HasSubstr("Q 28"));
}

TEST(SineFindings, NegativeResistanceIsCalledSkewAndKeepsItsSign) {
  DrivenSineBench bench = noisy();
  bench.skew_s = 800e-9;   // R_s appears as 2 - 3.2 ohm
  SineRequest request = exact_sine_request(bench);
  request.bench.current.skew = StatedValue::exact(0, Unit::second);
  const Measurement m = measured_sine(simulated_sine(bench).capture, request);
  const Finding* f = finding(m, "negative_resistance");
  ASSERT_NE(f, nullptr);
  EXPECT_THAT(f->message, HasSubstr("skew"));
  ASSERT_NE(m.find("R_s"), nullptr);
  EXPECT_NEAR(m.find("R_s")->quantity.value, -1.157, 0.03);
  EXPECT_EQ(m.find("Q"), nullptr);
}

TEST(SineFindings, AnUnresolvedResistanceIsWithheldToABound) {
  DrivenSineBench bench = noisy();
  bench.resistance_ohm = 0.05;
  SineRequest request = exact_sine_request(bench);
  request.bench.current.skew = StatedValue::rectangular(0, 100e-9, Unit::second);
  const Measurement m = measured_sine(simulated_sine(bench).capture, request);
  EXPECT_NE(finding(m, "resistance_unresolved"), nullptr);
  EXPECT_EQ(m.find("R_s"), nullptr);
  EXPECT_EQ(m.find("P"), nullptr);
  ASSERT_NE(bound(m, "R_s"), nullptr);
  EXPECT_GT(*bound(m, "R_s")->at_most, 0.05);
  ASSERT_NE(bound(m, "Q"), nullptr);
  EXPECT_LT(*bound(m, "Q")->at_least, 62.8 / 0.05);
  EXPECT_NE(m.find("Z"), nullptr);
  EXPECT_NE(m.find("L_s"), nullptr);
}

TEST(SineFindings, LowQSaysHowFarSeriesAndParallelDiffer) {
  DrivenSineBench bench = noisy();
  bench.resistance_ohm = 62.8;
  const Measurement m = measured_sine(simulated_sine(bench).capture, exact_sine_request(bench));
  const Finding* f = finding(m, "low_q");
  ASSERT_NE(f, nullptr);
  EXPECT_EQ(f->severity, Severity::note);
  EXPECT_THAT(f->message, HasSubstr("100 %"));
}

TEST(SineFindings, TheShuntInsideTheCoilVoltageIsNoticedByTheWindingResistance) {
  DrivenSineBench bench = noisy();
  bench.shunt_ohm = 1;
  bench.over_shunt = true;
  SineRequest request = exact_sine_request(bench);
  request.bench.winding_resistance = StatedValue::rectangular(2, 0.02, Unit::ohm);
  const auto record = simulated_sine(bench);
  const Measurement m = measured_sine(record.capture, request);
  const Finding* f = finding(m, "shunt_drop_included");
  ASSERT_NE(f, nullptr);
  EXPECT_EQ(f->severity, Severity::caution);
  EXPECT_NEAR(m.find("R_s")->quantity.value, 3, 0.1);
  request.bench.voltage.column = "CH1";
  request.bench.current.column = "CH2";
  request.bench.voltage.low_column = "CH2";
  const Measurement right = measured_sine(record.capture, request);
  EXPECT_EQ(finding(right, "shunt_drop_included"), nullptr);
  EXPECT_NEAR(right.find("R_s")->quantity.value, 2, 0.1);
}

TEST(SineFindings, DifferentFrequenciesInTheChannelsAreRefused) {
  for (const double other : {10.02e3, 13e3}) {
    DrivenSineBench bench = noisy();
    bench.samples = 20000;
    bench.sample_interval_s = 0.5e-6;
    Capture capture = simulated_sine(bench).capture;
    bench.frequency_hz = other;
    capture.channels[1] = simulated_sine(bench).capture.channels[1];
    const Measurement m = measured_sine(capture, exact_sine_request(bench));
    const Finding* f = finding(m, "different_frequencies");
    ASSERT_NE(f, nullptr) << other;
    EXPECT_EQ(f->severity, Severity::refusal);
    EXPECT_EQ(m.find("Z"), nullptr);
  }
}

TEST(SineFindings, SwappedChannelsAreNoticed) {
  const DrivenSineBench bench = noisy();
  Capture capture = simulated_sine(bench).capture;
  std::swap(capture.channels[0].samples, capture.channels[1].samples);
  const Measurement m = measured_sine(capture, exact_sine_request(bench));
  const Finding* f = finding(m, "channels_suspect");
  ASSERT_NE(f, nullptr);
  EXPECT_THAT(f->message, HasSubstr("swapped"));
  EXPECT_EQ(m.find("L_s"), nullptr);
  EXPECT_NE(m.find("Z"), nullptr);
}

TEST(SineFindings, AnInvertedCurrentIsToldFromSwappedChannels) {
  DrivenSineBench bench = noisy();
  bench.resistance_ohm = 30;
  bench.current_gain = -1;
  const Measurement m = measured_sine(simulated_sine(bench).capture, exact_sine_request(bench));
  const Finding* f = finding(m, "channels_suspect");
  ASSERT_NE(f, nullptr);
  EXPECT_THAT(f->message, HasSubstr("counted against"));
}

TEST(SineFindings, ClippedCrestsAreLeftOutAndSaid) {
  DrivenSineBench bench = noisy();
  bench.bits = 10;
  bench.voltage_full_scale_v = 0.9;
  const auto record = simulated_sine(bench);
  const Measurement m = measured_sine(record.capture, exact_sine_request(bench));
  const Finding* f = finding(m, "clipped");
  ASSERT_NE(f, nullptr);
  EXPECT_EQ(f->severity, Severity::caution);
  ASSERT_NE(m.find("Z"), nullptr);
  EXPECT_NEAR(m.find("Z")->quantity.value, record.truth.z_ohm, 5e-3 * record.truth.z_ohm);
}

TEST(SineFindings, AChannelClippedThroughoutIsRefused) {
  DrivenSineBench bench = noisy();
  bench.bits = 10;
  bench.voltage_full_scale_v = 0.2;
  const Measurement m = measured_sine(simulated_sine(bench).capture, exact_sine_request(bench));
  const Finding* f = finding(m, "clipped");
  ASSERT_NE(f, nullptr);
  EXPECT_EQ(f->severity, Severity::refusal);
  EXPECT_EQ(m.find("Z"), nullptr);
}

TEST(SineFindings, FewCyclesCoarseRangeAndThinSamplingAreSaid) {
  DrivenSineBench bench = noisy();
  bench.sample_interval_s = 2.3e-4 / 10000;
  EXPECT_NE(finding(measured_sine(simulated_sine(bench).capture, exact_sine_request(bench)), "few_cycles"), nullptr);
  bench = noisy();
  bench.bits = 8;
  bench.current_full_scale_a = 0.3;
  EXPECT_NE(finding(measured_sine(simulated_sine(bench).capture, exact_sine_request(bench)), "coarse_range"), nullptr);
  bench = noisy();
  bench.sample_interval_s = 1e-4 / 3.3;
  EXPECT_NE(finding(measured_sine(simulated_sine(bench).capture, exact_sine_request(bench)), "aliased"), nullptr);
}

TEST(SineFindings, AStrongThirdHarmonicOfTheCurrentMeansSaturation) {
  DrivenSineBench bench = noisy();
  bench.third_harmonic_ratio = 0.08;
  const auto record = simulated_sine(bench);
  const Measurement m = measured_sine(record.capture, exact_sine_request(bench));
  const Finding* f = finding(m, "harmonics");
  ASSERT_NE(f, nullptr);
  EXPECT_NEAR(f->figure, 0.08, 0.002);
  EXPECT_NEAR(m.find("Z")->quantity.value, record.truth.z_ohm, 4 * m.find("Z")->quantity.standard_uncertainty);
}

TEST(SineFindings, ASineThatGrowsIsNotSteady) {
  DrivenSineBench bench = noisy();
  Capture capture = simulated_sine(bench).capture;
  for (std::size_t n = 0; n < capture.samples(); ++n) {
    const double gain = 0.5 + static_cast<double>(n) / 10000;
    for (Channel& channel : capture.channels) channel.samples[n] *= gain;
  }
  EXPECT_NE(finding(measured_sine(capture, exact_sine_request(bench)), "not_steady"), nullptr);
}

TEST(SineFindings, ADeadChannelIsRefused) {
  DrivenSineBench bench = noisy();
  Capture capture = simulated_sine(bench).capture;
  Random random(3);
  for (double& v : capture.channels[1].samples) v = 1e-5 * random.normal();
  const Measurement m = measured_sine(capture, exact_sine_request(bench));
  const Finding* f = finding(m, "no_signal");
  ASSERT_NE(f, nullptr);
  EXPECT_EQ(f->severity, Severity::refusal);
  EXPECT_EQ(m.find("Z"), nullptr);
}

TEST(SineFindings, TheEarthedScopeAndTheHotShuntAreCautioned) {
  DrivenSineBench bench = noisy();
  bench.shunt_ohm = 1;
  bench.amplitude_v = 60;
  const Measurement m = measured_sine(simulated_sine(bench).capture, exact_sine_request(bench));
  std::vector<std::string> codes;
  for (const Caution& c : m.cautions) codes.push_back(c.code);
  EXPECT_THAT(codes, testing::IsSupersetOf({"stored_energy", "over_voltage", "shunt_heating", "earthed_scope"}));
}

// Clean captures of many kinds: at most 3 of 300 raise a caution or a refusal.
TEST(SineFindings, CleanCapturesRaiseNoAlarm) {
  int alarms = 0;
  std::string last;
  for (int t = 0; t < 300; ++t) {
    Random random(static_cast<std::uint64_t>(t), 41);
    DrivenSineBench bench;
    bench.frequency_hz = std::pow(10, random.uniform(2, 5));
    bench.inductance_h = std::pow(10, random.uniform(-5, -2));
    const double x = 2 * std::numbers::pi * bench.frequency_hz * bench.inductance_h;
    bench.resistance_ohm = x / std::pow(10, random.uniform(-0.3, 1.5));
    bench.phase_rad = random.uniform(0, 6.28);
    bench.samples = static_cast<std::size_t>(std::pow(10, random.uniform(3, 4)));
    bench.sample_interval_s = random.uniform(2, 60) / bench.frequency_hz / static_cast<double>(bench.samples);
    const double current = 1 / std::hypot(x, bench.resistance_ohm);
    bench.voltage_noise_v = std::pow(10, -random.uniform(1.5, 3));
    bench.current_noise_a = current * std::pow(10, -random.uniform(1.5, 3));
    const int bits[] = {0, 8, 10, 12};
    bench.bits = bits[t % 4];
    bench.seed = static_cast<std::uint64_t>(t);
    SineRequest request;
    request.bench.current.skew = StatedValue::rectangular(0, 1e-4 / bench.frequency_hz, Unit::second);
    const Measurement m = measured_sine(simulated_sine(bench).capture, request);
    const bool raised = std::any_of(m.findings.begin(), m.findings.end(), [&](const Finding& f) {
      if (f.severity != Severity::note) last = f.message;
      return f.severity != Severity::note;
    });
    alarms += raised ? 1 : 0;
  }
  EXPECT_LE(alarms, 3) << last;
}

}  // namespace
}  // namespace coilassay

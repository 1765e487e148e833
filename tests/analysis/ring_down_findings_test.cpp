// Every ring-down and capture finding that applies: planted, and found; silent on clean captures.
#include <gtest/gtest.h>

#include <cmath>

#include "base/random.h"
#include "tests/support/ring_down_bench.h"

namespace coilassay {
namespace {

using test::covers;
using test::exact_request;
using test::finding;
using test::measured;
using test::simulated;

synthetic::RingDownBench clean() {
  synthetic::RingDownBench bench;
  bench.noise_v = 5e-3;
  bench.seed = 5;
  return bench;
}

Measurement measure(const synthetic::RingDownBench& bench) {
  const auto record = simulated(bench);
  return measured(record.capture, exact_request(bench));
}

TEST(RingDownFindings, ClippedStart) {
  auto bench = clean();
  bench.bits = 8;
  bench.resistance_ohm = 3;
  bench.full_scale_v = 2.5;  // the ringing starts at 3.4 V
  const Measurement result = measure(bench);
  ASSERT_TRUE(result.has_finding("clipped"));
  ASSERT_NE(result.find("R_s"), nullptr);
  EXPECT_EQ(finding(result, "clipped")->severity, Severity::caution);
  EXPECT_NEAR(result.find("L_s")->quantity.value, 47e-6, 5 * result.find("L_s")->quantity.standard_uncertainty);
  EXPECT_NEAR(result.find("R_s")->quantity.value, 3, 5 * result.find("R_s")->quantity.standard_uncertainty);
}

TEST(RingDownFindings, ClippedNearlyToTheEnd) {
  auto bench = clean();
  bench.bits = 8;
  bench.full_scale_v = 1.5;  // forty periods, 3.4 V falling to 1.9 V: every crest is cut off
  const Measurement result = measure(bench);
  ASSERT_TRUE(result.has_finding("clipped"));
  ASSERT_NE(result.find("L_s"), nullptr);
  EXPECT_NEAR(result.find("L_s")->quantity.value, 47e-6, 5 * result.find("L_s")->quantity.standard_uncertainty);
  EXPECT_LT(result.find("L_s")->quantity.standard_uncertainty, 1e-3 * 47e-6);
  EXPECT_NEAR(result.find("R_s")->quantity.value, 0.35, 5 * result.find("R_s")->quantity.standard_uncertainty);
}

// People meet the energy of the release, also when its crests are cut off and the window begins later: 50 mA in 47 uH
// hold 59 nJ.
TEST(RingDownCautions, SpeakOfTheReleaseAndNotOfTheWindow) {
  auto bench = clean();
  bench.bits = 8;
  bench.resistance_ohm = 3;
  bench.full_scale_v = 1.2;
  const Measurement result = measure(bench);
  ASSERT_TRUE(result.has_finding("clipped"));
  ASSERT_FALSE(result.cautions.empty());
  EXPECT_EQ(result.cautions.front().code, "stored_energy");
  EXPECT_NEAR(result.cautions.front().figure, 59e-9, 6e-9);
  ASSERT_TRUE(result.conditions.peak_current_a);
  EXPECT_LT(*result.conditions.peak_current_a, 0.04);  // the level at which L_s holds is that of the window
}

TEST(RingDownCautions, AVoltageIsWarnedOfAlsoWithoutACapacitor) {
  auto bench = clean();
  bench.initial_current_a = 1;  // 69 V
  const auto record = simulated(bench);
  RingDownRequest request = exact_request(bench);
  request.bench.capacitors.clear();
  const Measurement result = measured(record.capture, request);
  ASSERT_EQ(result.cautions.size(), 1u);
  EXPECT_EQ(result.cautions.front().code, "over_voltage");
  EXPECT_NEAR(result.cautions.front().figure, 68, 2);
}

TEST(RingDownFindings, CoarseRange) {
  auto bench = clean();
  bench.bits = 8;
  bench.full_scale_v = 60;
  EXPECT_TRUE(measure(bench).has_finding("coarse_range"));
}

TEST(RingDownFindings, FewCycles) {
  auto bench = clean();
  bench.resistance_ohm = 50;
  EXPECT_TRUE(measure(bench).has_finding("few_cycles"));
}

TEST(RingDownFindings, HardlySampled) {
  auto bench = clean();
  bench.sample_interval_s = 2e-6;  // 2.15 samples a period
  bench.samples = 2000;
  bench.resistance_ohm = 0.05;
  EXPECT_TRUE(measure(bench).has_finding("aliased"));
}

TEST(RingDownFindings, DriveInsideAStatedWindow) {
  auto bench = clean();
  bench.drive_time_s = 60e-6;
  bench.drive_frequency_hz = 150e3;
  const auto record = simulated(bench);
  RingDownRequest request = exact_request(bench);
  request.from_s = -40e-6;
  const Measurement result = measured(record.capture, request);
  ASSERT_TRUE(result.has_finding("drive_in_window"));
  EXPECT_EQ(finding(result, "drive_in_window")->severity, Severity::refusal);
  EXPECT_NEAR(finding(result, "drive_in_window")->figure, 0, 1e-6);  // where the free decay does begin
  EXPECT_EQ(result.find("f_0"), nullptr);
}

TEST(RingDownFindings, SecondMode) {
  for (const double ratio : {1.1, 1.3, 2.7}) {
    auto bench = clean();
    bench.second_amplitude_ratio = 0.1;
    bench.second_frequency_ratio = ratio;
    const Measurement result = measure(bench);
    ASSERT_TRUE(result.has_finding("second_mode")) << ratio;
    EXPECT_NEAR(finding(result, "second_mode")->figure, 0.1, 0.02) << ratio;
    EXPECT_TRUE(covers(*result.find("L_s"), 47e-6)) << ratio;
    EXPECT_TRUE(covers(*result.find("R_s"), 0.35)) << ratio;
  }
}

TEST(RingDownFindings, LevelDependence) {
  for (const double resistance : {0.35, 1.5, 5.0}) {
    auto bench = clean();
    bench.initial_current_a = 0.5;
    bench.saturation_per_a2 = 0.2;  // L falls by 5 % at the first crest
    bench.resistance_ohm = resistance;
    const Measurement result = measure(bench);
    ASSERT_TRUE(result.has_finding("level_dependent")) << resistance;
    EXPECT_FALSE(result.has_finding("second_mode")) << resistance;
    EXPECT_TRUE(covers(*result.find("L_s"), 47e-6)) << resistance;
  }
}

TEST(RingDownFindings, NearCritical) {
  auto bench = clean();
  bench.resistance_ohm = 120;
  bench.initial_voltage_v = 3;
  EXPECT_TRUE(measure(bench).has_finding("near_critical"));
}

TEST(RingDownFindings, ProbeLoading) {
  auto bench = clean();
  bench.capacitance_f = 100e-12;
  bench.probe_capacitance_f = 12e-12;
  const Measurement result = measure(bench);
  ASSERT_TRUE(result.has_finding("probe_loading"));
  EXPECT_NEAR(finding(result, "probe_loading")->figure, 12.0 / 112, 0.01);
}

TEST(RingDownFindings, CapacitorLoss) {
  auto bench = clean();
  bench.capacitor_dissipation = 0.02;
  const Measurement result = measure(bench);
  ASSERT_TRUE(result.has_finding("capacitor_loss"));
  EXPECT_EQ(finding(result, "capacitor_loss")->severity, Severity::caution);
}

TEST(RingDownFindings, NoRingingIsRefusedWithoutANumber) {
  auto bench = clean();
  bench.initial_current_a = 1e-9;
  const Measurement result = measure(bench);
  ASSERT_TRUE(result.has_finding("no_ringing"));
  EXPECT_EQ(finding(result, "no_ringing")->severity, Severity::refusal);
  EXPECT_TRUE(result.estimates.empty());
}

// The frequency of a driven sine is the generator's.
TEST(RingDownFindings, ASteadyOrGrowingSineIsRefused) {
  for (const double growth : {0.0, 1e-6, -1e-4}) {
    Capture capture;
    capture.source.name = "made";
    capture.time = {0, 1e-7, {}};
    Channel channel;
    channel.name = "CH1";
    channel.unit = Unit::volt;
    Random random(2);
    for (int i = 0; i < 5000; ++i) channel.samples.push_back(std::exp(-growth * i) * std::sin(0.07 * i) + 0.01 * random.normal());
    capture.channels.push_back(channel);
    const Measurement result = measured(capture, {});
    EXPECT_EQ(result.find("f_0"), nullptr) << growth;
    ASSERT_TRUE(result.has_finding("drive_in_window")) << growth;
    EXPECT_EQ(finding(result, "drive_in_window")->severity, Severity::refusal) << growth;
  }
}

// At most 3 in 300 clean captures raise a caution or a refusal (full size in tests/proof).
TEST(RingDownFindings, StaySilentOnCleanCaptures) {
  int alarms = 0;
  std::string which;
  Random random(77);
  for (int i = 0; i < 300; ++i) {
    synthetic::RingDownBench bench;
    bench.samples = 3000;
    const double q = std::pow(10, random.uniform(-0.1, 2.7));
    bench.resistance_ohm = std::sqrt(bench.inductance_h / bench.capacitance_f) / q;
    bench.initial_voltage_v = random.uniform(-1, 1);
    bench.noise_v = 3.4 * std::pow(10, -random.uniform(1.0, 3.0));
    bench.bits = i % 3 == 0 ? 8 : i % 3 == 1 ? 12 : 0;
    bench.seed = 500 + static_cast<std::uint64_t>(i);
    const Measurement result = measure(bench);
    for (const Finding& f : result.findings) {
      if (f.severity == Severity::note) continue;
      ++alarms;
      which += f.code + " (Q " + std::to_string(q) + ", noise " + std::to_string(bench.noise_v) + ", bits " +
               std::to_string(bench.bits) + ")\n";
      break;
    }
  }
  EXPECT_LE(alarms, 3) << which;
}

}  // namespace
}  // namespace coilassay

#include "analysis/ring_down.h"

#include <gtest/gtest.h>

#include <cmath>

#include "analysis/ring_down_circuit.h"
#include "tests/support/ring_down_bench.h"

namespace coilassay {
namespace {

using test::covers;
using test::exact_request;
using test::finding;
using test::measured;
using test::simulated;

// 47 uH and 0.35 ohm across 10 nF: 232 kHz, Q 196.
TEST(RingDown, RecoversCoilWithinItsStatedUncertainty) {
  synthetic::RingDownBench bench;
  bench.noise_v = 5e-3;
  bench.seed = 11;
  const auto record = simulated(bench);
  const Measurement result = measured(record.capture, exact_request(bench));
  ASSERT_NE(result.find("L_s"), nullptr);
  const Quantity l = result.find("L_s")->quantity, r = result.find("R_s")->quantity;
  EXPECT_NEAR(l.value, 47e-6, 4 * l.standard_uncertainty);     // honest
  EXPECT_LT(l.standard_uncertainty, 1e-4 * 47e-6);             // and useful
  EXPECT_NEAR(r.value, 0.35, 4 * r.standard_uncertainty);
  EXPECT_LT(r.standard_uncertainty, 0.01 * 0.35);
  EXPECT_NEAR(result.find("f_0")->quantity.value, record.truth.f_0_hz, 4 * result.find("f_0")->quantity.standard_uncertainty);
  EXPECT_NEAR(result.find("Q_coil")->quantity.value, record.truth.q_coil, 0.02 * record.truth.q_coil);
  EXPECT_NEAR(*result.conditions.peak_current_a, bench.initial_current_a, 0.03 * bench.initial_current_a);
}

// The exact relations of docs/formulas.md#ring-down, both ways.
TEST(RingDown, RelationsInvertTheCircuit) {
  const double l = 150e-6, r = 12, c = 1e-9, g = 1 / 10e3, d = 0.002;
  const double omega0 = std::sqrt((1 + r * g) / (l * c));
  const double alpha = (r / l + g / c + omega0 * d) / 2;
  const CoilOfDecay coil = coil_of_decay(omega0, alpha, c, g, d);
  EXPECT_NEAR(coil.inductance_h, l, 1e-12 * l);
  EXPECT_NEAR(coil.resistance_ohm, r, 1e-9 * r);
}

TEST(RingDown, TakesOutWhateverStaysAcrossTheCoil) {
  synthetic::RingDownBench bench;
  bench.capacitance_f = 1e-9;
  bench.across_resistance_ohm = 10e3;
  bench.across_capacitance_f = 30e-12;
  bench.probe_resistance_ohm = 1e6;
  bench.noise_v = 2e-3;
  const auto record = simulated(bench);
  const Measurement result = measured(record.capture, exact_request(bench));
  ASSERT_NE(result.find("R_s"), nullptr);
  EXPECT_NEAR(result.find("L_s")->quantity.value, 47e-6, 5 * result.find("L_s")->quantity.standard_uncertainty);
  EXPECT_NEAR(result.find("R_s")->quantity.value, 0.35, 5 * result.find("R_s")->quantity.standard_uncertainty);
  EXPECT_GT(result.find("Q_coil")->quantity.value, 3 * result.find("Q")->quantity.value);
}

TEST(RingDown, AToleranceLeftUnsaidEntersByDefaultAndIsNamed) {
  synthetic::RingDownBench bench;
  bench.noise_v = 2e-3;
  const auto record = simulated(bench);
  RingDownRequest request;
  request.bench.capacitors.push_back({StatedValue::unstated(10e-9, Unit::farad), std::nullopt});
  const Measurement result = measured(record.capture, request);
  const Estimate* l = result.find("L_s");
  ASSERT_NE(l, nullptr);
  EXPECT_NEAR(l->half_width() / l->quantity.value, 0.95 * 0.05, 0.003);
  EXPECT_TRUE(covers(*l, 47e-6));
  const auto& lines = result.budget.at("L_s");
  EXPECT_EQ(lines.front().source, "capacitor");
  EXPECT_TRUE(lines.front().basis.starts_with("default:"));
  EXPECT_TRUE(result.has_finding("capacitor_dominates"));
}

TEST(RingDown, WithoutACapacitorGivesFrequencyDecayAndAdvice) {
  synthetic::RingDownBench bench;
  const auto record = simulated(bench);
  const Measurement result = measured(record.capture, RingDownRequest{});
  EXPECT_NE(result.find("f_0"), nullptr);
  EXPECT_NE(result.find("alpha"), nullptr);
  EXPECT_EQ(result.find("L_s"), nullptr);
  ASSERT_EQ(result.advice.size(), 2U);
  EXPECT_NE(result.advice[0].find("10 nF"), std::string::npos);
}

TEST(RingDown, RunsStraightThroughCriticalDamping) {
  for (const double q : {0.35, 0.45, 0.5, 0.55, 0.7, 1.1, 2.0}) {
    synthetic::RingDownBench bench;
    bench.probe_capacitance_f = 0;
    bench.probe_resistance_ohm = 1e12;
    bench.resistance_ohm = std::sqrt(bench.inductance_h / bench.capacitance_f) / q;
    bench.initial_voltage_v = 1;
    bench.samples = 4000;
    bench.noise_v = 1e-3;
    const auto record = simulated(bench);
    const Measurement result = measured(record.capture, exact_request(bench));
    ASSERT_NE(result.find("L_s"), nullptr) << q;
    const Quantity l = result.find("L_s")->quantity;
    EXPECT_NEAR(l.value, 47e-6, 5 * l.standard_uncertainty) << q;
    EXPECT_LT(l.standard_uncertainty, 0.05 * 47e-6) << q;
    if (q < 0.49) {
      EXPECT_EQ(result.find("f_d"), nullptr) << q;
    }
    EXPECT_EQ(result.has_finding("near_critical"), q < 1) << q;
  }
}

TEST(RingDown, AResistanceLostInItsUncertaintyBecomesABound) {
  synthetic::RingDownBench bench;
  bench.noise_v = 1e-3;
  const auto record = simulated(bench);
  RingDownRequest request = exact_request(bench);
  // A capacitor whose loss is uncertain by more than the coil's own: 1/Q of the coil is 0.005.
  request.bench.capacitors[0].dissipation_factor = StatedValue::rectangular(0.0035, 0.004, Unit::one);
  const Measurement result = measured(record.capture, request);
  EXPECT_EQ(result.find("R_s"), nullptr);
  ASSERT_TRUE(result.has_finding("resistance_unresolved"));
  bool bound = false;
  for (const Bound& b : result.bounds) bound = bound || (b.symbol == "R_s" && *b.at_most > 0.35);
  EXPECT_TRUE(bound);
}

TEST(RingDown, FindsTheReleaseBehindADrivePortion) {
  for (const double drive_frequency : {0.0, 150e3, 232e3}) {
    synthetic::RingDownBench bench;
    bench.drive_time_s = 30e-6;
    bench.drive_frequency_hz = drive_frequency;
    bench.noise_v = 2e-3;
    const auto record = simulated(bench);
    const Measurement result = measured(record.capture, exact_request(bench));
    ASSERT_NE(result.find("L_s"), nullptr) << drive_frequency;
    const Quantity l = result.find("L_s")->quantity, r = result.find("R_s")->quantity;
    EXPECT_NEAR(l.value, 47e-6, 5 * l.standard_uncertainty) << drive_frequency;
    EXPECT_NEAR(r.value, 0.35, 5 * r.standard_uncertainty) << drive_frequency;
  }
}

TEST(RingDown, AStartTransientIsSkippedAndNoMoreThanNeeded) {
  synthetic::RingDownBench bench;
  bench.transient_ratio = 0.3;
  bench.noise_v = 5e-3;
  const double tau = 2 * bench.inductance_h / bench.resistance_ohm;
  bench.transient_tau_s = 0.02 * tau;
  const auto record = simulated(bench);
  RingDownRequest request = exact_request(bench);
  const Measurement result = measured(record.capture, request);
  ASSERT_NE(result.find("R_s"), nullptr);
  EXPECT_NEAR(result.find("R_s")->quantity.value, 0.35, 5 * result.find("R_s")->quantity.standard_uncertainty);
  EXPECT_NEAR(result.find("L_s")->quantity.value, 47e-6, 5 * result.find("L_s")->quantity.standard_uncertainty);
  EXPECT_LT(result.model->window_s->first, 0.4 * tau);
}

// An earthed scope over a coil that is not: both ends captured, the coil's voltage is their difference.
TEST(RingDown, SubtractsTheLowColumn) {
  synthetic::RingDownBench bench;
  bench.noise_v = 2e-3;
  auto record = simulated(bench);
  Channel low = record.capture.channels[0];
  low.name = "CH2";
  low.column = 3;
  Channel& high = record.capture.channels[0];
  for (std::size_t i = 0; i < low.samples.size(); ++i) {
    low.samples[i] = 0.8 * std::sin(0.0002 * static_cast<double>(i));   // hum on both ends
    high.samples[i] += low.samples[i];
  }
  record.capture.channels.push_back(low);
  RingDownRequest request = exact_request(bench);
  request.bench.voltage.column = "CH1";
  request.bench.voltage.low_column = "CH2";
  const Measurement result = measured(record.capture, request);
  ASSERT_NE(result.find("L_s"), nullptr);
  EXPECT_TRUE(covers(*result.find("L_s"), 47e-6));
  EXPECT_TRUE(covers(*result.find("R_s"), 0.35));
}

// The current of the same ringing dies away like the voltage: it must not be taken for the drive.
TEST(RingDown, ASecondRingingChannelIsNoDrive) {
  synthetic::RingDownBench bench;
  bench.noise_v = 2e-3;
  bench.resistance_ohm = 5;
  auto record = simulated(bench);
  const Measurement alone = measured(record.capture, exact_request(bench));
  record.capture.channels.push_back(record.capture.channels[0]);
  record.capture.channels[1].name = "CH2";
  const Measurement both = measured(record.capture, exact_request(bench));
  EXPECT_EQ(both.model->window_s->first, alone.model->window_s->first);
}

TEST(RingDown, TheStatedWindowIsKept) {
  synthetic::RingDownBench bench;
  bench.noise_v = 2e-3;
  const auto record = simulated(bench);
  RingDownRequest request = exact_request(bench);
  request.from_s = 20e-6;
  request.to_s = 120e-6;
  const Measurement result = measured(record.capture, request);
  EXPECT_NEAR(result.model->window_s->first, 20e-6, 2e-8);
  EXPECT_NEAR(result.model->window_s->second, 120e-6, 2e-8);
  EXPECT_TRUE(covers(*result.find("L_s"), 47e-6));
}

TEST(RingDown, TrialsGiveTheSameInterval) {
  synthetic::RingDownBench bench;
  bench.noise_v = 5e-3;
  const auto record = simulated(bench);
  RingDownRequest request;
  request.bench.capacitors.push_back({StatedValue::rectangular(10e-9, 1e-10, Unit::farad), std::nullopt});
  const Measurement first = measured(record.capture, request);
  request.propagation.by_trials = true;
  const Measurement trials = measured(record.capture, request);
  EXPECT_NEAR(trials.find("L_s")->half_width(), first.find("L_s")->half_width(), 0.02 * first.find("L_s")->half_width());
}

TEST(RingDown, TwoCapacitorsForOneCaptureAreRefused) {
  synthetic::RingDownBench bench;
  const auto record = simulated(bench);
  RingDownRequest request = exact_request(bench);
  request.bench.capacitors.push_back(request.bench.capacitors.front());
  const auto result = measure_ring_down(record.capture, request);
  ASSERT_FALSE(result);
  EXPECT_EQ(result.error().problem, Problem::usage);
}

// 95 % intervals of noise alone cover 93 to 97 % (full size in tests/proof); here a sample.
TEST(RingDown, IntervalsOfNoiseAloneCover) {
  int covered_l = 0, covered_r = 0;
  constexpr int kTrials = 300;
  for (int i = 0; i < kTrials; ++i) {
    synthetic::RingDownBench bench;
    bench.samples = 2000;
    bench.resistance_ohm = i % 2 == 0 ? 2 : 20;
    bench.noise_v = 0.05;
    bench.seed = 1000 + static_cast<std::uint64_t>(i);
    const auto record = simulated(bench);
    const Measurement result = measured(record.capture, exact_request(bench));
    const Estimate* l = result.find("L_s");
    const Estimate* r = result.find("R_s");
    covered_l += l != nullptr && covers(*l, bench.inductance_h) ? 1 : 0;
    covered_r += r != nullptr && covers(*r, bench.resistance_ohm) ? 1 : 0;
  }
  // Binomial: 95 % of 300 is 285 +- 3.8.
  EXPECT_GE(covered_l, 272);
  EXPECT_GE(covered_r, 272);
}

}  // namespace
}  // namespace coilassay

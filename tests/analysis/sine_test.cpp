// Impedance from a steady sine: values, corrections, intervals, tables over bias, the skew of a resistor.
#include "analysis/sine.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <numbers>
#include <utility>

#include "analysis/skew.h"
#include "base/random.h"
#include "tests/support/sine_bench.h"

namespace coilassay {
namespace {

using synthetic::DrivenSineBench;
using test::exact_sine_request;
using test::measured_sine;
using test::simulated_sine;

bool covers(const Estimate* e, double truth) { return e != nullptr && e->low <= truth && truth <= e->high; }

TEST(Sine, GivesEveryQuantityOfTheImpedance) {
  DrivenSineBench bench;
  bench.voltage_noise_v = 1e-3;
  bench.current_noise_a = 1e-5;
  const auto record = simulated_sine(bench);
  const Measurement m = measured_sine(record.capture, exact_sine_request(bench));
  const auto& t = record.truth;
  const std::pair<const char*, double> expected[] = {{"f", t.f_hz},     {"Z", t.z_ohm},   {"phi", t.phi_rad}, {"R_s", t.r_s_ohm},
                                                     {"X_s", t.x_s_ohm}, {"L_s", t.l_s_h}, {"R_p", t.r_p_ohm}, {"L_p", t.l_p_h},
                                                     {"Q", t.q},        {"D", t.d},       {"P", t.p_w}};
  for (const auto& [symbol, truth] : expected) {
    const Estimate* e = m.find(symbol);
    ASSERT_NE(e, nullptr) << symbol;
    EXPECT_NEAR(e->quantity.value, truth, 4 * e->quantity.standard_uncertainty) << symbol;
    EXPECT_LT(e->quantity.standard_uncertainty, 0.03 * std::fabs(truth)) << symbol;
  }
  EXPECT_NEAR(*m.conditions.frequency_hz, 10e3, 1);
  EXPECT_NEAR(*m.conditions.level_a, t.current_a / std::sqrt(2.0), 1e-5);
  EXPECT_TRUE(m.findings.empty()) << m.findings.front().message;
}

// The core under a driven winding of 1.5 ohm, seen by a sense winding of a tenth of its turns: what is left is the core's
// 2 ohm and the loss in it.
TEST(Sine, ASenseWindingShowsTheCoreAlone) {
  DrivenSineBench bench;
  bench.voltage_noise_v = 1e-5;
  auto record = simulated_sine(bench);
  for (double& v : record.capture.channels[0].samples) v /= 10;
  SineRequest request = exact_sine_request(bench);
  request.turns_ratio = StatedValue::unstated(10, Unit::one);
  request.bench.winding_resistance = StatedValue::exact(1.5, Unit::ohm);
  const Measurement m = measured_sine(record.capture, request);
  EXPECT_TRUE(covers(m.find("R_s"), 2));
  EXPECT_TRUE(covers(m.find("P"), record.truth.p_w));
  const double current = record.truth.current_a;
  ASSERT_NE(m.find("P_winding"), nullptr);
  EXPECT_NEAR(m.find("P_winding")->quantity.value, current * current / 2 * 1.5, 1e-4 * current * current);
  EXPECT_EQ(m.corrections.front().name, "turns ratio");

  request.turns_ratio = StatedValue::rectangular(10, 0.5, Unit::one);
  const Measurement loose = measured_sine(record.capture, request);
  EXPECT_NEAR(loose.find("Z")->quantity.standard_uncertainty / loose.find("Z")->quantity.value, 0.05 / std::sqrt(3.0), 1e-3);
}

// Q 31: a millisecond of arc counts. Without the corrections R_s would be off by far more than its interval.
TEST(Sine, SkewShuntInductanceAndDroopAreTakenOutExactly) {
  DrivenSineBench bench;
  bench.shunt_ohm = 0.1;
  bench.shunt_inductance_h = 3e-9;
  bench.skew_s = 150e-9;
  bench.probe_corner_hz = 0;
  const auto record = simulated_sine(bench);
  const Measurement m = measured_sine(record.capture, exact_sine_request(bench));
  ASSERT_NE(m.find("R_s"), nullptr);
  EXPECT_NEAR(m.find("R_s")->quantity.value, 2, 1e-7);
  EXPECT_NEAR(m.find("L_s")->quantity.value, 1e-3, 1e-12);

  DrivenSineBench probe;
  probe.probe_corner_hz = 700;
  const Measurement p = measured_sine(simulated_sine(probe).capture, exact_sine_request(probe));
  ASSERT_NE(p.find("R_s"), nullptr);
  EXPECT_NEAR(p.find("R_s")->quantity.value, 2, 1e-7);
  EXPECT_TRUE(p.has_finding("probe_droop"));
}

TEST(Sine, TheResistanceOfACoilOfHighQIsRuledByTheSkew) {
  DrivenSineBench bench;
  bench.voltage_noise_v = 1e-3;
  bench.current_noise_a = 1e-5;
  SineRequest request = exact_sine_request(bench);
  request.bench.current.skew = StatedValue::rectangular(0, 100e-9, Unit::second);
  const Measurement m = measured_sine(simulated_sine(bench).capture, request);
  const Estimate* r = m.find("R_s");
  ASSERT_NE(r, nullptr);
  // dR = X w dt: 62.8 ohm x 6283/s x 10 x 58 ns.
  EXPECT_NEAR(r->quantity.standard_uncertainty, 62.83 * 62832 * 100e-9 / std::sqrt(3.0), 0.02);
  EXPECT_EQ(m.budget.at("R_s").front().source, "skew");
  const Estimate* l = m.find("L_s");
  EXPECT_LT(l->quantity.standard_uncertainty / l->quantity.value, 1e-3);
}

// With the voltage gain ruling, R and X rise and fall together; with the skew alone they do not move together at all.
TEST(Sine, CorrelationsBetweenResistanceAndReactanceFollowTheirErrors) {
  DrivenSineBench bench;
  const auto record = simulated_sine(bench);
  SineRequest gain = exact_sine_request(bench);
  gain.bench.voltage.gain = StatedValue::rectangular(1, 0.02, Unit::one);
  const auto correlation = [](const Measurement& m) {
    for (const auto& c : m.correlations) {
      if (c.a == "R_s" && c.b == "X_s") return c.value;
    }
    return std::nan("");
  };
  EXPECT_NEAR(correlation(measured_sine(record.capture, gain)), 1, 1e-3);
  SineRequest skew = exact_sine_request(bench);
  skew.bench.current.skew = StatedValue::rectangular(0, 5e-9, Unit::second);
  // d(R, X) = w dt (-X, R): opposite signs, and the correlation is -1 although R barely moves X.
  EXPECT_NEAR(correlation(measured_sine(record.capture, skew)), -1, 1e-2);
}

TEST(Sine, WindingLossFollowsFromItsResistance) {
  DrivenSineBench bench;
  SineRequest request = exact_sine_request(bench);
  request.bench.winding_resistance = StatedValue::rectangular(1.5, 0.015, Unit::ohm);
  const auto record = simulated_sine(bench);
  const Measurement m = measured_sine(record.capture, request);
  const double i = record.truth.current_a;
  ASSERT_NE(m.find("P_winding"), nullptr);
  EXPECT_NEAR(m.find("P_winding")->quantity.value, i * i / 2 * 1.5, 1e-9);
  EXPECT_NEAR(m.find("P")->quantity.value, i * i / 2 * 2, 1e-9);
}

// Errors of gain, shunt, skew and shunt inductance drawn from their stated laws: 100 draws, 95 % within chance.
TEST(Sine, IntervalsCoverWhenEveryStatedErrorIsDrawn) {
  int z = 0, r = 0, l = 0;
  constexpr int kDraws = 100;
  for (int t = 0; t < kDraws; ++t) {
    Random random(static_cast<std::uint64_t>(t), 5);
    DrivenSineBench bench;
    bench.samples = 2000;
    bench.resistance_ohm = 6;
    bench.shunt_ohm = 1 + 0.01 * random.uniform(-1, 1);
    bench.shunt_inductance_h = 5e-9 + 3e-9 * random.uniform(-1, 1);
    bench.skew_s = 4e-9 + 10e-9 * random.uniform(-1, 1);
    bench.voltage_gain = 1 + 0.02 * random.uniform(-1, 1);
    bench.phase_rad = random.uniform(0, 6.28);
    bench.voltage_noise_v = 0.01;
    bench.current_noise_a = 2e-4;
    bench.bits = 8;
    bench.seed = static_cast<std::uint64_t>(t);
    SineRequest request;
    request.propagation.exact_bench = true;
    request.bench.voltage.gain = StatedValue::rectangular(1, 0.02, Unit::one);
    request.bench.current.shunt = StatedValue::rectangular(1, 0.01, Unit::ohm);
    request.bench.current.shunt_inductance = StatedValue::rectangular(5e-9, 3e-9, Unit::henry);
    request.bench.current.skew = StatedValue::rectangular(4e-9, 10e-9, Unit::second);
    const auto record = simulated_sine(bench);
    const Measurement m = measured_sine(record.capture, request);
    z += covers(m.find("Z"), record.truth.z_ohm) ? 1 : 0;
    r += covers(m.find("R_s"), record.truth.r_s_ohm) ? 1 : 0;
    l += covers(m.find("L_s"), record.truth.l_s_h) ? 1 : 0;
  }
  for (const int covered : {z, r, l}) EXPECT_GE(covered, 88);
}

TEST(SinePoints, OverBiasGiveTheSaturationCurrents) {
  std::vector<Capture> captures;
  SineRequest request;
  for (const double bias : {0.0, 0.5, 1.0, 1.5, 2.0, 2.5, 3.0}) {
    DrivenSineBench bench;
    bench.bias_a = bias;
    bench.saturation_per_a2 = 0.08;
    bench.voltage_noise_v = 1e-3;
    bench.current_noise_a = 1e-5;
    bench.seed = static_cast<std::uint64_t>(bias * 10) + 1;
    request = exact_sine_request(bench);
    captures.push_back(simulated_sine(bench).capture);
  }
  for (const double bias : {0.0, 0.5, 1.0, 1.5, 2.0, 2.5, 3.0}) {
    request.biases.push_back(StatedValue::rectangular(bias, 0.01 * bias, Unit::ampere));
  }
  request.traces = true;
  const auto m = measure_sine_points(captures, request);
  ASSERT_TRUE(m) << m.error().finding;
  EXPECT_EQ(m->points.size(), 7u);
  EXPECT_DOUBLE_EQ(*m->points[2].bias_a, 1.0);
  EXPECT_FALSE(m->tables.empty());
  // L0/(1 + 0.08 i^2) = (1 - d) L0 at i = sqrt(d/(1 - d)/0.08).
  for (const auto& [symbol, drop] : {std::pair{"I_sat_10", 0.1}, {"I_sat_20", 0.2}, {"I_sat_30", 0.3}}) {
    const Estimate* e = m->find(symbol);
    ASSERT_NE(e, nullptr) << symbol;
    const double truth = std::sqrt(drop / (1 - drop) / 0.08);
    EXPECT_TRUE(covers(e, truth)) << symbol << " " << e->low << " " << truth << " " << e->high;
    EXPECT_LT(e->half_width(), 0.06 * truth) << symbol;
    EXPECT_EQ(e->definition, "bias_small_signal");
  }
}

TEST(SinePoints, AKneeBeyondTheBiasesIsABound) {
  std::vector<Capture> captures;
  SineRequest request;
  for (const double bias : {0.0, 0.5, 1.0}) {
    DrivenSineBench bench;
    bench.saturation_per_a2 = 0.15;
    bench.bias_a = bias;
    captures.push_back(simulated_sine(bench).capture);
    request.biases.push_back(StatedValue::exact(bias, Unit::ampere));
  }
  request.propagation.exact_bench = true;
  const auto m = measure_sine_points(captures, request);
  ASSERT_TRUE(m);
  EXPECT_NE(m->find("I_sat_10"), nullptr);
  EXPECT_EQ(m->find("I_sat_30"), nullptr);
  ASSERT_FALSE(m->bounds.empty());
  EXPECT_DOUBLE_EQ(m->bounds.front().at_least.value(), 1.0);
  EXPECT_TRUE(m->has_finding("knee_not_reached"));
  request.biases.pop_back();
  EXPECT_FALSE(measure_sine_points(captures, request));
}

TEST(Skew, ComesFromAResistorWithTheInductancesTakenOut) {
  DrivenSineBench bench;
  bench.inductance_h = 8e-9;
  bench.resistance_ohm = 50;
  bench.frequency_hz = 1e6;
  bench.shunt_ohm = 1;
  bench.shunt_inductance_h = 4e-9;
  bench.skew_s = 7e-9;
  bench.voltage_noise_v = 1e-3;
  bench.current_noise_a = 2e-5;
  const auto record = simulated_sine(bench);
  SkewRequest request{exact_sine_request(bench), StatedValue::exact(50, Unit::ohm), StatedValue::exact(8e-9, Unit::henry)};
  const auto m = measure_skew(record.capture, request);
  ASSERT_TRUE(m) << m.error().finding;
  const Estimate* skew = m->find("skew");
  ASSERT_NE(skew, nullptr);
  EXPECT_NEAR(skew->quantity.value, 7e-9, 4 * skew->quantity.standard_uncertainty);
  EXPECT_LT(skew->quantity.standard_uncertainty, 0.1e-9);
  EXPECT_NE(m->find("Z"), nullptr);

  // Found with this shunt and stated with it, the skew makes a coil's resistance right: nothing is corrected twice.
  DrivenSineBench coil = bench;
  coil.inductance_h = 20e-6;
  coil.resistance_ohm = 3;
  SineRequest with = exact_sine_request(coil);
  with.bench.current.skew = StatedValue::normal(skew->quantity.value, skew->quantity.standard_uncertainty, Unit::second);
  const Measurement measured = measured_sine(simulated_sine(coil).capture, with);
  ASSERT_NE(measured.find("R_s"), nullptr);
  EXPECT_NEAR(measured.find("R_s")->quantity.value, 3, 4 * measured.find("R_s")->quantity.standard_uncertainty);
  EXPECT_LT(measured.find("R_s")->quantity.standard_uncertainty, 0.1);

  request.resistor = StatedValue::rectangular(68, 0.68, Unit::ohm);
  const auto wrong = measure_skew(record.capture, request);
  ASSERT_TRUE(wrong);
  EXPECT_TRUE(wrong->has_finding("resistor_differs"));
}

}  // namespace
}  // namespace coilassay

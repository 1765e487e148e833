// What is noticed about a sweep, planted and found, and silence on clean ones.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>

#include "analysis/sweep.h"
#include "tests/support/sweep_bench.h"

namespace coilassay {
namespace {

using synthetic::CoilSweepBench;
using testing::HasSubstr;

SweepRequest exact() {
  SweepRequest request;
  request.propagation.exact_bench = true;
  return request;
}

Measurement measured(const Sweep& sweep, const SweepRequest& request = exact()) {
  const auto result = measure_sweep(sweep, request);
  EXPECT_TRUE(result) << (result ? "" : result.error().finding);
  return result ? *result : Measurement{};
}

const Finding* finding(const Measurement& m, std::string_view code) {
  for (const Finding& each : m.findings) {
    if (each.code == code) return &each;
  }
  return nullptr;
}

const CoilSweepBench kCoil{.skin_ohm = 0.3, .parallel_resistance_ohm = 20e3, .noise_ratio = 1e-3};

TEST(SweepFindings, NearResonanceGivesBothInductances) {
  SweepRequest request = exact();
  request.at_hz = {1e5, 2e6, 8e6};
  const Measurement m = measured(simulate_coil_sweep(kCoil)->sweep, request);
  std::vector<double> near;
  for (const Finding& each : m.findings) {
    if (each.code == "near_resonance") near.push_back(each.figure);
  }
  ASSERT_EQ(near.size(), 2U);   // 100 kHz is 0.02 of it
  EXPECT_NEAR(near[0], 2e6 / 5.033e6, 1e-3);
  EXPECT_THAT(finding(m, "near_resonance")->message, HasSubstr("118"));   // 100 uH/(1 - 0.397^2)
  EXPECT_THAT(m.findings.back().message, HasSubstr("capacitor"));
}

TEST(SweepFindings, ARangeChangeGoneWrongIsNotCausal) {
  CoilSweepBench bench = kCoil;
  bench.step_ratio = 0.02;
  bench.step_frequency_hz = 1e5;
  const Measurement m = measured(simulate_coil_sweep(bench)->sweep);
  ASSERT_NE(finding(m, "not_causal"), nullptr);
  EXPECT_EQ(finding(m, "not_causal")->severity, Severity::caution);
  EXPECT_FALSE(measured(simulate_coil_sweep(kCoil)->sweep).has_finding("not_causal"));
}

TEST(SweepFindings, SpoiltPointsAreNamedAsNotCausal) {
  CoilSweepBench bench = kCoil;
  bench.outliers = 2;
  const auto record = simulate_coil_sweep(bench);
  const Measurement m = measured(record->sweep);
  ASSERT_NE(finding(m, "not_causal"), nullptr);
  EXPECT_NEAR(finding(m, "not_causal")->figure, 0.3, 0.15);
}

// A core whose permeability falls by 10 % over the sweep: no circuit of constants.
Sweep falling_core(double noise) {
  CoilSweepBench bench = kCoil;
  bench.noise_ratio = noise;
  Sweep sweep = simulate_coil_sweep(bench)->sweep;
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    const double t = static_cast<double>(i) / 200;
    sweep.z_ohm[i][0] *= 1 + 0.05 * std::sin(9 * t);
  }
  return sweep;
}

TEST(SweepFindings, AMisfitIsSaidAndWidensTheIntervals) {
  const Measurement m = measured(falling_core(1e-3));
  ASSERT_NE(finding(m, "model_misfit"), nullptr);
  EXPECT_EQ(finding(m, "model_misfit")->severity, Severity::caution);
  ASSERT_NE(m.find("L"), nullptr);
  // The sizes differ by 5 % either way: an L to a tenth of a per cent would be a lie.
  EXPECT_GT(m.find("L")->half_width(), 0.01 * m.find("L")->quantity.value);
}

TEST(SweepFindings, AMisfitWithinTheStatedAccuracyIsNone) {
  SweepRequest request = exact();
  request.bench.impedance.ratio = StatedValue::unstated(0.08, Unit::one);
  const Measurement m = measured(falling_core(1e-3), request);
  EXPECT_FALSE(m.has_finding("model_misfit"));
  ASSERT_NE(m.find("L"), nullptr);
  EXPECT_GT(m.find("L")->half_width(), 0.05 * m.find("L")->quantity.value);
}

TEST(SweepFindings, NoiseIsNoCoil) {
  Sweep sweep = simulate_coil_sweep(kCoil)->sweep;
  Random random(3);
  for (auto& z : sweep.z_ohm) z[0] = {100 * std::exp(random.normal()), 100 * random.normal()};
  const Measurement m = measured(sweep);
  EXPECT_EQ(m.find("L"), nullptr);
  EXPECT_TRUE(std::any_of(m.findings.begin(), m.findings.end(), [](const Finding& f) { return f.severity == Severity::refusal; }));
}

TEST(SweepFindings, NegativeResistanceThroughoutIsRefused) {
  Sweep sweep = simulate_coil_sweep(kCoil)->sweep;
  for (auto& z : sweep.z_ohm) z[0] = {-z[0].real(), z[0].imag()};
  const Measurement m = measured(sweep);
  EXPECT_EQ(m.find("L"), nullptr);
  ASSERT_NE(finding(m, "negative_resistance"), nullptr);
  EXPECT_EQ(finding(m, "negative_resistance")->severity, Severity::refusal);
}

TEST(SweepFindings, NegativeResistanceAtSomePointsIsACaution) {
  CoilSweepBench bench = kCoil;
  bench.phase_error_rad = 0.05;   // Q is 90 in the middle: the resistance turns negative there
  const Measurement m = measured(simulate_coil_sweep(bench)->sweep);
  ASSERT_NE(finding(m, "negative_resistance"), nullptr);
  EXPECT_EQ(finding(m, "negative_resistance")->severity, Severity::caution);
}

TEST(SweepFindings, RadiansReadAsDegreesAreRefused) {
  Sweep sweep = simulate_coil_sweep(kCoil)->sweep;
  for (auto& z : sweep.z_ohm) z[0] = std::polar(std::abs(z[0]), std::arg(z[0]) * std::numbers::pi / 180);
  const Measurement m = measured(sweep);
  EXPECT_EQ(m.find("L"), nullptr);
  ASSERT_NE(finding(m, "angle_unit"), nullptr);
  EXPECT_EQ(finding(m, "angle_unit")->severity, Severity::refusal);
}

/// As a file of size and angle of S has it whose radians stand where degrees are read.
Sweep with_radians_for_degrees(Sweep sweep) {
  for (auto& z : sweep.z_ohm) {
    const std::complex<double> s = (z[0] - 50.0) / (z[0] + 50.0);
    const std::complex<double> read = std::polar(std::abs(s), std::arg(s) * std::numbers::pi / 180);
    z[0] = 50.0 * (1.0 + read) / (1.0 - read);
  }
  sweep.as_read = "S11";
  sweep.reference_ohm = {50};
  return sweep;
}

TEST(SweepFindings, RadiansOfAReflectionReadAsDegreesAreRefused) {
  for (const double inductance : {100e-6, 1e-3}) {
    const CoilSweepBench bench{.inductance_h = inductance, .start_hz = 10e3, .stop_hz = 10e6, .noise_ratio = 1e-3};
    const Measurement m = measured(with_radians_for_degrees(simulate_coil_sweep(bench)->sweep), {});
    EXPECT_EQ(m.find("L"), nullptr) << inductance;
    EXPECT_NE(finding(m, "angle_unit"), nullptr) << inductance;
  }
}

// 40 mH from 10 kHz on: 2.5 kilohm and more, so that no angle of S exceeds 2.3 degrees, and they are degrees.
TEST(SweepFindings, SmallAnglesOfALargeCoilAreNotTakenForRadians) {
  for (const double noise : {0.0, 1e-3}) {
    Sweep sweep = synthetic::simulate_coil_sweep({.inductance_h = 40e-3, .resistance_ohm = 20, .start_hz = 10e3, .stop_hz = 1e6, .noise_ratio = noise})->sweep;
    sweep.as_read = "S11";
    sweep.reference_ohm = {50};
    const Measurement m = measured(sweep, {});
    EXPECT_EQ(finding(m, "angle_unit"), nullptr);
    ASSERT_NE(m.find("L"), nullptr);
    EXPECT_NEAR(m.find("L")->quantity.value / 40e-3, 1, 0.02);
  }
}

TEST(SweepFindings, AnglesOfTheWrongSignAreRefused) {
  Sweep sweep = simulate_coil_sweep(kCoil)->sweep;
  for (auto& z : sweep.z_ohm) z[0] = std::conj(z[0]);
  const Measurement m = measured(sweep);
  EXPECT_EQ(m.find("L"), nullptr);
  ASSERT_NE(finding(m, "angle_unit"), nullptr);
  EXPECT_THAT(finding(m, "angle_unit")->message, HasSubstr("sign"));
}

TEST(SweepFindings, LowQNamesTheTwoInductances) {
  SweepRequest request = exact();
  request.at_hz = {2e3};
  const Measurement m = measured(simulate_coil_sweep(kCoil)->sweep, request);   // 1.26 ohm against 0.5 ohm
  ASSERT_NE(finding(m, "low_q"), nullptr);
  EXPECT_NEAR(finding(m, "low_q")->figure, 2.5, 0.1);
}

TEST(SweepFindings, TooLittleOfASweepIsAFailure) {
  Sweep sweep = synthetic::simulate_coil_sweep({.points = 3})->sweep;
  auto refused = measure_sweep(sweep, exact());
  ASSERT_FALSE(refused);
  EXPECT_EQ(refused.error().problem, Problem::too_few_samples);
  EXPECT_THAT(refused.error().finding, HasSubstr("3 usable points"));

  sweep = simulate_coil_sweep(kCoil)->sweep;
  for (double& f : sweep.frequency_hz) f = 1e5;
  refused = measure_sweep(sweep, exact());
  ASSERT_FALSE(refused);
  EXPECT_THAT(refused.error().finding, HasSubstr("one frequency"));

  sweep = simulate_coil_sweep(kCoil)->sweep;
  sweep.ports = 2;
  EXPECT_FALSE(measure_sweep(sweep, exact()));
}

TEST(SweepFindings, FrequenciesThatAreNoneAreLeftOutAndNamed) {
  Sweep sweep = simulate_coil_sweep(kCoil)->sweep;
  sweep.frequency_hz[0] = 0;
  sweep.frequency_hz[1] = -10;
  const Measurement m = measured(sweep);
  ASSERT_EQ(m.model->left_out.size(), 2U);
  EXPECT_THAT(m.model->left_out[0], HasSubstr("above zero"));
  EXPECT_NE(m.find("L"), nullptr);
}

// A sample of the proof of false alarms: a rate of 10 in 2000 gives more than 4 in 300 once in 50 times.
TEST(SweepFindings, CleanSweepsRaiseNoAlarm) {
  int alarms = 0;
  for (std::uint64_t seed = 1; seed <= 300; ++seed) {
    Random random(seed, 8);
    const CoilSweepBench bench = [&] {
      CoilSweepBench b = test::draw_coil(random, std::pow(10, random.uniform(-4, -2)));
      b.seed = seed;
      return b;
    }();
    const Measurement m = measured(simulate_coil_sweep(bench)->sweep);
    const auto alarm = std::find_if(m.findings.begin(), m.findings.end(), [](const Finding& f) { return f.severity != Severity::note; });
    if (alarm == m.findings.end() && m.find("L") != nullptr) continue;
    ++alarms;
    std::cerr << "seed " << seed << ": " << (alarm == m.findings.end() ? "no L" : alarm->message) << '\n';
  }
  EXPECT_LE(alarms, 3);
}

}  // namespace
}  // namespace coilassay

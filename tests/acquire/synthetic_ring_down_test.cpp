#include "acquire/synthetic/ring_down.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <cstring>
#include <limits>
#include <numbers>

namespace coilassay {
namespace {

using synthetic::RingDownBench;
using synthetic::RingDownRecord;
using synthetic::RingDownTruth;

constexpr double kInfinity = std::numeric_limits<double>::infinity();

RingDownRecord simulated(const RingDownBench& bench) {
  Result<RingDownRecord> record = synthetic::simulate_ring_down(bench);
  EXPECT_TRUE(record) << (record ? "" : record.error().finding);
  return record ? std::move(*record) : RingDownRecord{};
}

/// Nothing but the coil and its capacitor.
RingDownBench bare() {
  RingDownBench bench;
  bench.probe_capacitance_f = 0;
  bench.probe_resistance_ohm = kInfinity;
  bench.samples = 2000;
  return bench;
}

const std::vector<double>& volts(const RingDownRecord& record) {
  return record.capture.channels.at(0).samples;
}

double time_of(const RingDownRecord& record, std::size_t n) {
  return record.capture.time.start_s + static_cast<double>(n) * record.capture.time.step_s;
}

double largest(const std::vector<double>& v) {
  double most = 0;
  for (const double x : v) most = std::max(most, std::fabs(x));
  return most;
}

/// The circuit's equations as Kirchhoff gives them, integrated by classical Runge-Kutta steps: nothing shared with the
/// code under test. Capacitor C in series with r, conductance g across the node, coil with L(i) = L/(1 + s i^2).
struct Reference {
  double l, r_coil, c, g, r_loss, s;
  double i, u;

  double node(double current, double inside) const {
    // i + g v + (v - u)/r = 0 solved for v; without loss v is u.
    return r_loss > 0 ? (inside / r_loss - current) / (g + 1 / r_loss) : inside;
  }
  double current_slope(double current, double inside) const {
    return (node(current, inside) - r_coil * current) * (1 + s * current * current) / l;
  }
  double inside_slope(double current, double inside) const { return -(current + g * node(current, inside)) / c; }
  void step(double h) {
    const double i1 = current_slope(i, u), u1 = inside_slope(i, u);
    const double i2 = current_slope(i + h / 2 * i1, u + h / 2 * u1), u2 = inside_slope(i + h / 2 * i1, u + h / 2 * u1);
    const double i3 = current_slope(i + h / 2 * i2, u + h / 2 * u2), u3 = inside_slope(i + h / 2 * i2, u + h / 2 * u2);
    const double i4 = current_slope(i + h * i3, u + h * u3), u4 = inside_slope(i + h * i3, u + h * u3);
    i += h / 6 * (i1 + 2 * i2 + 2 * i3 + i4);
    u += h / 6 * (u1 + 2 * u2 + 2 * u3 + u4);
  }
};

double loss_resistance(const RingDownBench& b, const RingDownTruth& truth) {
  return b.capacitor_dissipation / (2 * std::numbers::pi * truth.f_0_hz * truth.c_total_f);
}

Reference reference(const RingDownBench& b, const RingDownTruth& truth) {
  const double g = 1 / b.probe_resistance_ohm + (b.across_resistance_ohm > 0 ? 1 / b.across_resistance_ohm : 0);
  return {b.inductance_h,      b.resistance_ohm,    truth.c_total_f,    g, loss_resistance(b, truth),
          b.saturation_per_a2, b.initial_current_a, b.initial_voltage_v};
}

/// Largest deviation from the reference over the peak, `steps` Runge-Kutta steps between samples.
double deviation(const RingDownBench& bench, const RingDownRecord& record, int steps) {
  Reference circuit = reference(bench, record.truth);
  const auto& v = volts(record);
  double worst = 0, peak_i = 0, peak_v = 0;
  for (std::size_t n = 0; n < v.size(); ++n) {
    if (time_of(record, n) < -0.5 * record.capture.time.step_s) continue;
    const double node = circuit.node(circuit.i, circuit.u);
    worst = std::max(worst, std::fabs(v[n] - node));
    peak_i = std::max(peak_i, std::fabs(circuit.i));
    peak_v = std::max(peak_v, std::fabs(node));
    for (int k = 0; k < steps; ++k) circuit.step(record.capture.time.step_s / steps);
  }
  EXPECT_NEAR(peak_i, record.truth.peak_current_a, 2e-3 * peak_i);  // between samples it may be a little higher
  EXPECT_LE(peak_v, record.truth.peak_voltage_v * (1 + 1e-9));
  EXPECT_NEAR(peak_v, record.truth.peak_voltage_v, 2e-3 * peak_v);
  return worst / largest(v);
}

TEST(SyntheticRingDown, LosslessCircuitRingsAtThomsonsFrequencyForEver) {
  RingDownBench bench = bare();
  bench.resistance_ohm = 0;
  bench.initial_voltage_v = 2;
  bench.pretrigger_fraction = 0;
  const auto record = simulated(bench);
  const double omega = 1 / std::sqrt(bench.inductance_h * bench.capacitance_f);
  const double z = std::sqrt(bench.inductance_h / bench.capacitance_f);
  EXPECT_NEAR(record.truth.f_0_hz, omega / (2 * std::numbers::pi), 1e-15 * omega);
  EXPECT_EQ(record.truth.alpha_per_s, 0);
  EXPECT_EQ(record.truth.q, kInfinity);
  // 40 periods across the record.
  EXPECT_NEAR(2000 * record.capture.time.step_s * record.truth.f_0_hz, 40, 1e-9);
  for (std::size_t n = 0; n < 2000; ++n) {
    const double phase = omega * time_of(record, n);
    EXPECT_NEAR(volts(record)[n], 2 * std::cos(phase) - 0.05 * z * std::sin(phase), 1e-11);
  }
  EXPECT_NEAR(record.truth.peak_voltage_v, std::hypot(2, 0.05 * z), 1e-12);
  EXPECT_NEAR(record.truth.peak_current_a, std::hypot(2 / z, 0.05), 1e-13);
}

// reference case "ring_down" (textbook identity, VERIFIED; constructed): 100 uH, 0.5 ohm, 1 uF.
TEST(SyntheticRingDown, TruthOfTheSeriesCircuit) {
  RingDownBench bench = bare();
  bench.inductance_h = 100e-6;
  bench.capacitance_f = 1e-6;
  bench.resistance_ohm = 0.5;
  const RingDownTruth truth = simulated(bench).truth;
  EXPECT_NEAR(2 * std::numbers::pi * truth.f_0_hz, 1e5, 1e-7);
  EXPECT_NEAR(truth.alpha_per_s, 2500, 1e-9);
  EXPECT_NEAR(truth.q, 20, 1e-11);
  EXPECT_NEAR(truth.q_coil, 20, 1e-11);
  EXPECT_NEAR(truth.alpha_per_s / truth.f_d_hz, 0.1571287431, 1e-10);  // logarithmic decrement
}

// reference case "self_capacitance_line" (NBS Circular 74, section 19; constructed): 150 uH with 12 pF of its own.
TEST(SyntheticRingDown, CoilsOwnCapacitanceCountsAndTheTruthSaysWhatIsSeenWithoutIt) {
  const double c_pf[] = {100, 150, 200, 300, 400, 500};
  const double f_hz[] = {1227907.0441, 1020979.4360, 892496.6027, 735693.9847, 640215.0720, 574300.9327};
  for (int k = 0; k < 6; ++k) {
    RingDownBench bench = bare();
    bench.inductance_h = 150e-6;
    bench.parallel_capacitance_f = 12e-12;
    bench.capacitance_f = c_pf[k] * 1e-12;
    const RingDownTruth truth = simulated(bench).truth;
    EXPECT_NEAR(truth.f_0_hz, f_hz[k], 1e-4);
    EXPECT_EQ(truth.l_s_h, 150e-6);
    EXPECT_EQ(truth.c_par_f, 12e-12);
    EXPECT_NEAR(truth.c_total_f, (c_pf[k] + 12) * 1e-12, 1e-24);
    EXPECT_NEAR(truth.apparent_l_s_h, 150e-6 * (c_pf[k] + 12) / c_pf[k], 1e-15);
  }
}

// The relations of the measurement, with everything across that a bench may have.
TEST(SyntheticRingDown, FollowsTheRelationsOfTheMeasurement) {
  RingDownBench bench;
  bench.resistance_ohm = 3;
  bench.across_resistance_ohm = 10e3;
  bench.across_capacitance_f = 30e-12;
  bench.capacitance_f = 1e-9;
  const double r = 1 / (1 / 10e6 + 1 / 10e3), c = 1e-9 + 13e-12 + 30e-12;
  for (const double d : {0.0, 0.001, 0.01}) {
    bench.capacitor_dissipation = d;
    const RingDownTruth truth = simulated(bench).truth;
    const double omega = 2 * std::numbers::pi * truth.f_0_hz;
    // Without loss exact; with it but for products of D with 1/(w R C) and R_s/R.
    const double slack = 1e-13 + d * (1 / (omega * r * c) + 3 / r);
    EXPECT_NEAR(omega * omega, (1 + 3 / r) / (47e-6 * c), slack * omega * omega) << d;
    EXPECT_NEAR(2 * truth.alpha_per_s, 3 / 47e-6 + 1 / (r * c) + omega * d, slack * 2 * truth.alpha_per_s) << d;
    EXPECT_NEAR(truth.apparent_l_s_h, 47e-6, 2 * slack * 47e-6) << d;
  }
  // With nothing across, the loss adds w0 D exactly and leaves the frequency alone.
  bench = bare();
  bench.capacitor_dissipation = 0.02;
  const RingDownTruth truth = simulated(bench).truth;
  const double omega = 1 / std::sqrt(47e-6 * 10e-9);
  EXPECT_NEAR(2 * std::numbers::pi * truth.f_0_hz, omega, 1e-14 * omega);
  EXPECT_NEAR(2 * truth.alpha_per_s, 0.35 / 47e-6 + omega * 0.02, 1e-12 * truth.alpha_per_s);
}

// From Q 200 to Q 0.05, straight through critical damping. Runge-Kutta of order 4 with w h under 0.02: (w h)^4/120 a
// radian, 251 radians: 3e-7 at most; halving its step must bring it 16 times closer, until rounding.
TEST(SyntheticRingDown, AgreesWithAStepByStepIntegration) {
  for (const double q : {200.0, 5.0, 1.0, 0.55, 0.5, 0.45, 0.2, 0.05}) {
    RingDownBench bench;
    bench.samples = 2000;
    bench.parallel_capacitance_f = 5e-12;
    bench.across_resistance_ohm = 20e3;
    bench.capacitor_dissipation = 0.004;
    bench.resistance_ohm = std::sqrt(bench.inductance_h / bench.capacitance_f) / q;
    bench.initial_voltage_v = 1;
    const auto record = simulated(bench);
    const double coarse = deviation(bench, record, 10), fine = deviation(bench, record, 20);
    EXPECT_LT(coarse, 3e-7) << q;
    EXPECT_LT(fine, coarse / 14 + 1e-11) << q;
  }
}

TEST(SyntheticRingDown, ExactlyCriticalDampingHasItsOwnClosedForm) {
  RingDownBench bench = bare();
  bench.inductance_h = 1e-4;
  bench.capacitance_f = 1e-8;
  bench.resistance_ohm = 200;
  bench.initial_voltage_v = 3;
  bench.initial_current_a = 0;
  bench.pretrigger_fraction = 0;
  const auto record = simulated(bench);
  EXPECT_NEAR(record.truth.q, 0.5, 1e-12);
  EXPECT_NEAR(record.truth.f_d_hz, 0, 1e-6 * record.truth.f_0_hz);
  for (std::size_t n = 0; n < 2000; ++n) {
    const double x = 1e6 * time_of(record, n);
    EXPECT_NEAR(volts(record)[n], 3 * (1 + x) * std::exp(-x), 1e-12);
  }
  EXPECT_EQ(record.truth.peak_voltage_v, 3);
  EXPECT_NEAR(record.truth.peak_current_a, 3 * 1e-8 * 1e6 / std::numbers::e, 1e-12);  // C w v0 / e
}

TEST(SyntheticRingDown, EightDecayTimesWhenTheyAreShorterAndTenSamplesAPeriod) {
  RingDownBench bench = bare();
  bench.resistance_ohm = 20;
  auto record = simulated(bench);
  EXPECT_NEAR(2000 * record.capture.time.step_s * record.truth.alpha_per_s, 8, 1e-9);
  bench.resistance_ohm = 0.1;
  bench.samples = 100;
  record = simulated(bench);
  EXPECT_NEAR(record.capture.time.step_s * record.truth.f_0_hz, 0.1, 1e-12);
}

TEST(SyntheticRingDown, SaturatingCoilAgreesWithAStepByStepIntegration) {
  for (const double saturation : {0.2, 4.0, 40.0}) {
    RingDownBench bench;
    bench.samples = 2000;
    bench.initial_current_a = 0.5;
    bench.saturation_per_a2 = saturation;
    bench.capacitor_dissipation = 0.002;
    const auto record = simulated(bench);
    const double coarse = deviation(bench, record, 40), fine = deviation(bench, record, 80);
    EXPECT_LT(coarse, 1e-7 * (1 + saturation)) << saturation;
    EXPECT_LT(fine, coarse / 14 + 1e-10) << saturation;  // what remains is the reference's own error
    EXPECT_LT(deviation(bench, record, 320), 1e-9) << saturation;
  }
}

// Energy of the ideal circuit: magnetic, of L(i) = L/(1 + s i^2), L ln(1 + s i^2)/(2 s); electric, C v^2/2.
TEST(SyntheticRingDown, SaturatingCoilKeepsItsEnergyOverTenThousandRadians) {
  RingDownBench bench = bare();
  bench.resistance_ohm = 0;
  bench.saturation_per_a2 = 2;
  bench.initial_current_a = 1;
  bench.samples = 16000;
  bench.sample_interval_s = 0.1 / std::sqrt(1 / (bench.inductance_h * bench.capacitance_f)) * 2 * std::numbers::pi;
  const auto record = simulated(bench);
  const double energy = bench.inductance_h * std::log(3.0) / 4;
  const double v_peak = std::sqrt(2 * energy / bench.capacitance_f);
  EXPECT_NEAR(record.truth.peak_voltage_v, v_peak, 1e-6 * v_peak);
  EXPECT_NEAR(record.truth.peak_current_a, 1, 1e-6);
  // Late crests are as high as early ones; the finest sampling of a crest leaves (w dt)^2/8.
  const auto& v = volts(record);
  const double late = *std::max_element(v.end() - 2000, v.end());
  EXPECT_NEAR(late, v_peak, 1e-4 * v_peak);
  EXPECT_LT(late, v_peak * (1 + 1e-9));
}

TEST(SyntheticRingDown, SmallLevelsOfASaturatingCoilAreTheLinearCircuit) {
  RingDownBench bench;
  bench.samples = 2000;
  const auto linear = simulated(bench);
  bench.saturation_per_a2 = 1e-12;
  const auto stepped = simulated(bench);
  for (std::size_t n = 0; n < 2000; ++n)
    EXPECT_NEAR(volts(stepped)[n], volts(linear)[n], 1e-9 * largest(volts(linear)));
}

TEST(SyntheticRingDown, SineDriveRunsIntoTheReleaseWithoutAStep) {
  RingDownBench bench;
  bench.initial_voltage_v = 0.7;
  bench.drive_time_s = 15e-6;
  bench.drive_frequency_hz = 150e3;
  bench.drive_channel = true;
  const auto record = simulated(bench);
  const auto& v = volts(record);
  const std::size_t release = 2000;  // a tenth of 20000
  EXPECT_EQ(time_of(record, release), 0);
  const auto on = release - static_cast<std::size_t>(15e-6 / record.capture.time.step_s);
  for (std::size_t n = 0; n + 1 < on; ++n) ASSERT_EQ(v[n], 0);
  // Second differences: a step would show at once.
  const double bend = std::pow(2 * std::numbers::pi * 240e3 * record.capture.time.step_s, 2) * largest(v);
  EXPECT_NEAR(v[release], 0.7, 1e-12);
  EXPECT_LT(std::fabs(v[release] - 2 * v[release - 1] + v[release - 2]), bend);
  // Driven: v'' = -(2 pi 150 kHz)^2 v.
  const double cosine = std::cos(2 * std::numbers::pi * 150e3 * record.capture.time.step_s);
  for (std::size_t n = on + 2; n + 1 < release; ++n) ASSERT_NEAR(v[n - 1] + v[n + 1], 2 * cosine * v[n], 1e-9);

  const Channel& gate = record.capture.channels.at(1);
  EXPECT_EQ(gate.name, "CH2");
  EXPECT_EQ(gate.samples[on + 1], 5);
  EXPECT_EQ(gate.samples[release - 1], 5);
  EXPECT_EQ(gate.samples[release], 0);
  EXPECT_EQ(gate.samples.front(), 0);
}

TEST(SyntheticRingDown, DirectCurrentDriveShowsTheWindingsDrop) {
  RingDownBench bench;
  bench.drive_time_s = 10e-6;
  const auto record = simulated(bench);
  EXPECT_NEAR(volts(record)[1999], 0.35 * 0.05, 1e-15);
  const auto rising = 2000 - static_cast<std::size_t>(7e-6 / record.capture.time.step_s);
  EXPECT_NEAR(volts(record)[rising], 47e-6 * 0.05 / 5e-6, 0.35 * 0.05);
}

TEST(SyntheticRingDown, SecondModeAndTransientAreAddedToTheFirst) {
  RingDownBench bench;
  const auto plain = simulated(bench);
  bench.second_amplitude_ratio = 0.1;
  bench.transient_ratio = 0.3;
  bench.transient_tau_s = 1e-6;
  const auto record = simulated(bench);
  const double amplitude = 0.05 * std::sqrt(47e-6 / record.truth.c_total_f);
  EXPECT_EQ(volts(record)[1999], 0);
  for (std::size_t n = 2000; n < 20000; n += 7) {
    const double t = time_of(record, n);
    // The first begins as -sin.
    const double second = -0.1 * amplitude * std::exp(-plain.truth.alpha_per_s * t) *
                          std::sin(2 * std::numbers::pi * 1.3 * plain.truth.f_d_hz * t);
    ASSERT_NEAR(volts(record)[n] - volts(plain)[n], second + 0.3 * amplitude * std::exp(-t / 1e-6), 1e-9);
  }
  EXPECT_EQ(record.truth.f_0_hz, plain.truth.f_0_hz);
  EXPECT_EQ(record.truth.peak_voltage_v, plain.truth.peak_voltage_v);
}

TEST(SyntheticScope, GainOffsetAndClockErrorAreThoseStated) {
  RingDownBench bench = bare();
  bench.resistance_ohm = 0;
  bench.gain = 1.02;
  bench.offset_v = -0.3;
  bench.timebase_error = 1e-3;
  const auto record = simulated(bench);
  const double omega = 2 * std::numbers::pi * record.truth.f_0_hz;
  const double peak = record.truth.peak_voltage_v;
  for (std::size_t n = 200; n < 2000; ++n) {
    const double true_time = time_of(record, n) * 1.001;
    ASSERT_NEAR(volts(record)[n], -1.02 * peak * std::sin(omega * true_time) - 0.3, 1e-9);
  }
}

TEST(SyntheticScope, CodesAreMultiplesOfOneStepAndClipAtBothEnds) {
  RingDownBench bench;
  bench.bits = 8;
  bench.full_scale_v = 2;  // the ringing starts at 3.4 V
  const auto record = simulated(bench);
  const Channel& channel = record.capture.channels.at(0);
  EXPECT_EQ(channel.resolution, 2.0 / 128);
  EXPECT_EQ(channel.full_scale, 2);
  for (const double v : channel.samples) {
    ASSERT_EQ(v / channel.resolution, std::nearbyint(v / channel.resolution));
    ASSERT_FALSE(v == 0 && std::signbit(v));
  }
  EXPECT_EQ(*std::min_element(channel.samples.begin(), channel.samples.end()), -2);
  EXPECT_EQ(*std::max_element(channel.samples.begin(), channel.samples.end()), 127 * 2.0 / 128);
  // Inside the range nothing is off by more than half a step.
  bench.bits = 0;
  const auto exact = simulated(bench);
  EXPECT_TRUE(std::isnan(exact.capture.channels[0].resolution));
  for (std::size_t n = 0; n < 20000; ++n) {
    if (std::fabs(volts(exact)[n]) > 1.98) continue;
    ASSERT_LE(std::fabs(volts(exact)[n] - channel.samples[n]), channel.resolution / 2 * (1 + 1e-12));
  }
}

TEST(SyntheticScope, RangeFitsTheRecordWhenNoneIsStated) {
  RingDownBench bench;
  bench.bits = 12;
  const auto record = simulated(bench);
  EXPECT_NEAR(record.capture.channels[0].full_scale, 1.2 * record.truth.peak_voltage_v,
              1e-4 * record.truth.peak_voltage_v);
  EXPECT_EQ(record.capture.channels[0].resolution, record.capture.channels[0].full_scale / 2048);
}

TEST(SyntheticScope, NoiseIsWhiteGaussianOfTheStatedSize) {
  RingDownBench bench;
  const auto clean = simulated(bench);
  bench.noise_v = 0.02;
  const auto noisy = simulated(bench);
  double sum = 0, squares = 0, neighbours = 0, fourth = 0, before = 0;
  for (std::size_t n = 0; n < 20000; ++n) {
    const double e = (volts(noisy)[n] - volts(clean)[n]) / 0.02;
    sum += e;
    squares += e * e;
    fourth += e * e * e * e;
    neighbours += e * before;
    before = e;
  }
  // Four standard errors each: 1/sqrt(N), sqrt(2/N), sqrt(24/N), 1/sqrt(N) with N = 20000.
  EXPECT_NEAR(sum / 20000, 0, 0.029);
  EXPECT_NEAR(squares / 20000, 1, 0.04);
  EXPECT_NEAR(fourth / 20000, 3, 0.3);
  EXPECT_NEAR(neighbours / 20000, 0, 0.029);
}

TEST(SyntheticScope, SameSeedGivesTheSameBytesAndAnotherOthers) {
  RingDownBench bench;
  bench.noise_v = 1e-3;
  bench.drive_channel = true;
  const auto first = simulated(bench), second = simulated(bench);
  for (std::size_t c = 0; c < 2; ++c) {
    const auto &a = first.capture.channels[c].samples, &b = second.capture.channels[c].samples;
    ASSERT_EQ(a.size(), b.size());
    EXPECT_EQ(std::memcmp(a.data(), b.data(), a.size() * sizeof(double)), 0);
  }
  EXPECT_EQ(first.capture.source.sha256, second.capture.source.sha256);
  EXPECT_EQ(first.capture.source.bytes, 2 * 20000 * sizeof(double));
  bench.seed = 2;
  const auto other = simulated(bench);
  EXPECT_NE(first.capture.source.sha256, other.capture.source.sha256);
  EXPECT_NE(volts(first)[5], volts(other)[5]);
}

TEST(SyntheticRingDown, ImpossibleBenchesAreRefusedWithTheirReason) {
  const double nan = std::nan("");
  const auto refuse = [](const RingDownBench& bench, const std::string& word) {
    const auto record = synthetic::simulate_ring_down(bench);
    ASSERT_FALSE(record) << word;
    EXPECT_EQ(record.error().problem, Problem::bad_number) << word;
    EXPECT_THAT(record.error().finding, ::testing::HasSubstr(word));
    EXPECT_FALSE(record.error().remedy.empty());
  };
  const auto changed = [](auto change) {
    RingDownBench bench;
    change(bench);
    return bench;
  };
  refuse(changed([](auto& b) { b.inductance_h = -1e-6; }), "inductance is -1e-06 H");
  refuse(changed([](auto& b) { b.capacitance_f = 0; }), "capacitance is 0 F");
  refuse(changed([&](auto& b) { b.resistance_ohm = nan; }), "resistance is nan ohm");
  refuse(changed([](auto& b) { b.inductance_h = kInfinity; }), "inductance is inf");
  refuse(changed([](auto& b) { b.probe_resistance_ohm = 0; }), "probe resistance");
  refuse(changed([](auto& b) { b.across_resistance_ohm = -1; }), "resistance across");
  refuse(changed([](auto& b) { b.pretrigger_fraction = 1; }), "pre-trigger");
  refuse(changed([](auto& b) { b.bits = 25; }), "25 bits");
  refuse(changed([](auto& b) { b.bits = -1; }), "-1 bits");
  refuse(changed([](auto& b) { b.samples = 1; }), "1 samples");
  refuse(changed([](auto& b) { b.noise_v = -1; }), "noise");
  refuse(changed([](auto& b) { b.transient_ratio = 0.1; }), "transient time constant");
  refuse(changed([](auto& b) { b.timebase_error = -1; }), "time base");
  refuse(changed([](auto& b) {
           b.inductance_h = 1e300;
           b.capacitance_f = 1e300;
         }),
         "beyond");
  refuse(changed([](auto& b) {
           b.initial_current_a = 1e308;
           b.inductance_h = 1e6;
         }),
         "beyond");
  refuse(changed([](auto& b) {
           b.saturation_per_a2 = 1;
           b.resistance_ohm = 1e9;
         }),
         "steps");
}

}  // namespace
}  // namespace coilassay

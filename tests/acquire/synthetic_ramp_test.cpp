#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

#include "acquire/synthetic/driven_ramp.h"

namespace coilassay::synthetic {
namespace {

DrivenRampRecord simulated(const DrivenRampBench& bench) {
  Result<DrivenRampRecord> record = simulate_driven_ramp(bench);
  EXPECT_TRUE(record) << (record ? "" : record.error().finding);
  return std::move(*record);
}

TEST(CoreLaw, SaturationCurrentsStandWhereTheLawHasThem) {
  const CoreLaw knee{CoreKind::knee, 10e-6, 1e-6, 10, 6};
  EXPECT_NEAR(knee.current_at_drop(0.2), 10 * std::pow(9.0 / 7.0 - 1, 1.0 / 6), 1e-9);
  const CoreLaw tanh{CoreKind::tanh, 10e-6, 1e-6, 10, 0};
  EXPECT_NEAR(tanh.current_at_drop(0.1), 10 * std::acosh(std::sqrt(9.0 / 8.0)), 1e-9);
  EXPECT_NEAR(tanh.flux(12), 1e-6 * 12 + 9e-6 * 10 * std::tanh(1.2), 1e-16);
  const CoreLaw powder{CoreKind::powder, 10e-6, 1e-6, 10, 0};
  EXPECT_NEAR(powder.flux(12), 1e-6 * 12 + 9e-6 * 10 * std::atan(1.2), 1e-16);
  const double secant = powder.current_at_secant_drop(0.3);
  EXPECT_NEAR(powder.flux(secant) / secant, 7e-6, 1e-15);
}

// A linear coil on a stiff supply: i = V/R (1 - exp(-t R/L)).
TEST(SimulatedRamp, ALinearCoilFollowsItsExponential) {
  DrivenRampBench b;
  b.core.saturated_inductance_h = b.core.inductance_h;
  b.resistance_ohm = 0.5;
  b.drive_time_s = 20e-6;
  const DrivenRampRecord record = simulated(b);
  const auto& amps = record.capture.channels[1].samples;
  for (std::size_t n = 0; n < amps.size(); ++n) {
    const double t = record.capture.time.start_s + static_cast<double>(n) * record.capture.time.step_s;
    const double expected = t <= 0 ? 0 : 20 * -std::expm1(-t * 0.5 / 10e-6);
    EXPECT_NEAR(amps[n], expected, 1e-9 * 20);
  }
}

// Without resistance the flux is V t, so that the arctangent core has a closed form t(i).
TEST(SimulatedRamp, ASaturatingCoilIsGoodToABillionth) {
  DrivenRampBench b;
  b.core.kind = CoreKind::powder;
  b.resistance_ohm = 0;
  const DrivenRampRecord record = simulated(b);
  const auto& amps = record.capture.channels[1].samples;
  for (std::size_t n = 1500; n < amps.size(); n += 500) {
    const double t = record.capture.time.start_s + static_cast<double>(n) * record.capture.time.step_s;
    const double flux = 1e-6 * amps[n] + 9e-5 * std::atan(amps[n] / 10);
    EXPECT_NEAR(flux, 10 * t, 1e-9 * 1e-4);
  }
}

// Energy of a bank with the coil: a quarter of an LC period, i = V sqrt(C/L) sin(w t).
TEST(SimulatedRamp, ABankSagsLikeAnOscillation) {
  DrivenRampBench b;
  b.core.saturated_inductance_h = b.core.inductance_h;
  b.resistance_ohm = 0;
  b.bank_capacitance_f = 100e-6;
  b.drive_time_s = 20e-6;
  const DrivenRampRecord record = simulated(b);
  const double w = 1 / std::sqrt(10e-6 * 100e-6), t = record.capture.time.step_s * 8000;
  EXPECT_NEAR(record.capture.channels[1].samples[9000], 10 * std::sqrt(10.0) * std::sin(w * t), 1e-8);
  EXPECT_NEAR(record.capture.channels[0].samples[9000], 10 * std::cos(w * t), 1e-8);
}

TEST(SimulatedRamp, TheFallThroughADiodeEndsAtZeroCurrent) {
  DrivenRampBench b;
  b.freewheel = true;
  b.pulses = 2;
  const DrivenRampRecord record = simulated(b);
  const auto& amps = record.capture.channels[1].samples;
  EXPECT_EQ(amps.back(), 0);
  for (double i : amps) EXPECT_GE(i, -1e-9);
}

TEST(SimulatedRamp, EddyCurrentsLoseWhatTheTruthSays) {
  DrivenRampBench b;
  b.core.saturated_inductance_h = b.core.inductance_h;
  b.resistance_ohm = 0;
  b.core_loss_ohm = 100;
  b.drive_time_s = 10e-6;
  b.freewheel = true;
  b.diode_v = 5;
  // V^2/R over the drive, and the diode's over the fall, which lasts V/V_d times as long.
  EXPECT_NEAR(simulated(b).truth.w_loop_j, 100 / 100.0 * 10e-6 + 25 / 100.0 * 20e-6, 1e-12);
}

TEST(SimulatedRamp, ASwitchAtItsLimitHoldsTheCurrent) {
  DrivenRampBench b;
  b.current_limit_a = 5;
  b.drive_time_s = 10e-6;
  const DrivenRampRecord record = simulated(b);
  EXPECT_NEAR(record.capture.channels[1].samples.back(), 5, 0.02);
  EXPECT_NEAR(record.capture.channels[0].samples.back(), 0.05 * 5, 0.01);   // R i is left over the coil
}

TEST(SimulatedRamp, ShuntInductanceAddsAStepAndSkewDelays) {
  DrivenRampBench b;
  b.shunt_ohm = 0.01;
  b.shunt_inductance_h = 1e-9;
  const DrivenRampRecord with = simulated(b);
  EXPECT_EQ(with.capture.channels[1].unit, Unit::volt);
  EXPECT_NEAR(with.capture.channels[1].samples[1000], 1e-9 * 1e6, 1e-12);   // L_shunt di/dt at 10 V over 10 uH
  b.shunt_inductance_h = 0;
  const DrivenRampRecord plain = simulated(b);
  b.skew_s = 10 * plain.capture.time.step_s;
  const DrivenRampRecord late = simulated(b);
  EXPECT_NEAR(late.capture.channels[1].samples[5010], plain.capture.channels[1].samples[5000], 1e-10);
}

TEST(SimulatedRamp, AProbeDroopsByItsCorner) {
  DrivenRampBench b;
  b.core.saturated_inductance_h = b.core.inductance_h;
  b.resistance_ohm = 0;
  b.drive_time_s = 20e-6;
  b.probe_corner_hz = 500;
  const DrivenRampRecord record = simulated(b);
  // A ramp s t through a high-pass of corner w: s/w (1 - exp(-w t)).
  const double w = 2 * std::numbers::pi * 500, t = record.capture.time.step_s * 8000;
  EXPECT_NEAR(record.capture.channels[1].samples[9000], 1e6 / w * -std::expm1(-w * t), 1e-8);
}

TEST(SimulatedRamp, BenchesThatCannotBeAreRefused) {
  DrivenRampBench b;
  b.resistance_ohm = 1;   // 10 A at most
  EXPECT_FALSE(simulate_driven_ramp(b));
  b = {};
  b.pulses = 2;
  EXPECT_FALSE(simulate_driven_ramp(b));
  b = {};
  b.core.saturated_inductance_h = 20e-6;
  EXPECT_FALSE(simulate_driven_ramp(b));
  b = {};
  b.shunt_ohm = 0.1;
  b.probe_corner_hz = 10;
  EXPECT_FALSE(simulate_driven_ramp(b));
}

}  // namespace
}  // namespace coilassay::synthetic

// Two channels of a capture as the bench says they are.
#include "analysis/driven_capture.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

namespace coilassay {
namespace {

using testing::DoubleEq;
using testing::ElementsAre;
using testing::HasSubstr;

Channel channel(std::string name, Unit unit, std::size_t column, std::vector<double> samples) {
  Channel c;
  c.name = std::move(name);
  c.unit = unit;
  c.unit_stated = unit != Unit::one;
  c.column = column;
  c.samples = std::move(samples);
  return c;
}

Capture capture_of(std::vector<Channel> channels) {
  Capture capture;
  capture.source.name = "drive.csv";
  capture.time = {0, 1e-6, {}};
  capture.channels = std::move(channels);
  return capture;
}

Capture two_volts() {
  return capture_of({channel("CH1", Unit::volt, 2, {1, 2, 3}), channel("CH2", Unit::volt, 3, {0.1, 0.2, 0.3})});
}

StatedValue ohm(double value) { return StatedValue::rectangular(value, 0.01 * value, Unit::ohm); }

TEST(DrivenCapture, AShuntTurnsTheSecondVoltageIntoCurrent) {
  BenchSetup bench;
  bench.current.shunt = ohm(0.1);
  const auto record = driven_record(two_volts(), bench, {});
  ASSERT_TRUE(record) << record.error().finding;
  EXPECT_EQ(record->volt_name, "CH1");
  EXPECT_EQ(record->amp_name, "CH2");
  EXPECT_THAT(record->volts, ElementsAre(1, 2, 3));
  EXPECT_THAT(record->amps, ElementsAre(DoubleEq(1), DoubleEq(2), DoubleEq(3)));
  EXPECT_EQ(record->errors.current_gain.source, "shunt");
  EXPECT_DOUBLE_EQ(record->errors.current_gain.value, 1);
  EXPECT_NEAR(record->errors.current_gain.law.standard_uncertainty, 0.01 / std::sqrt(3.0), 1e-12);
}

TEST(DrivenCapture, AnEarthedScopeSubtractsTheShuntFromTheCoil) {
  BenchSetup bench;
  bench.current.shunt = ohm(0.1);
  bench.current.column = "CH2";
  bench.voltage.column = "CH1";
  bench.voltage.low_column = "CH2";
  Capture capture = two_volts();
  capture.channels[0].resolution = 0.04;
  capture.channels[1].resolution = 0.03;
  const auto record = driven_record(capture, bench, {});
  ASSERT_TRUE(record) << record.error().finding;
  EXPECT_THAT(record->volts, ElementsAre(DoubleEq(0.9), DoubleEq(1.8), DoubleEq(2.7)));
  EXPECT_DOUBLE_EQ(record->volt_resolution, 0.05);  // the rounding of both columns is in the difference
  EXPECT_DOUBLE_EQ(record->amp_resolution, 0.3);
}

TEST(DrivenCapture, AColumnInAmpereNeedsNoShunt) {
  const Capture capture =
      capture_of({channel("i", Unit::ampere, 2, {1, 2, 3}), channel("v", Unit::volt, 3, {4, 5, 6})});
  const auto record = driven_record(capture, {}, {});
  ASSERT_TRUE(record) << record.error().finding;
  EXPECT_EQ(record->amp_name, "i");
  EXPECT_THAT(record->volts, ElementsAre(4, 5, 6));
  EXPECT_EQ(record->errors.current_gain.source, "current gain");
}

TEST(DrivenCapture, VoltsWithoutAShuntAreRefusedWithWhatToSay) {
  const auto record = driven_record(two_volts(), {}, {});
  ASSERT_FALSE(record);
  EXPECT_EQ(record.error().problem, Problem::usage);
  EXPECT_THAT(record.error().remedy, HasSubstr("--current CH2 --shunt"));
}

TEST(DrivenCapture, AShuntForAColumnInAmpereIsRefused) {
  BenchSetup bench;
  bench.current.shunt = ohm(0.1);
  bench.current.column = "i";
  const auto record = driven_record(
      capture_of({channel("v", Unit::volt, 2, {4, 5, 6}), channel("i", Unit::ampere, 3, {1, 2, 3})}), bench, {});
  ASSERT_FALSE(record);
  EXPECT_THAT(record.error().finding, HasSubstr("already in A"));
}

TEST(DrivenCapture, AFileWithoutUnitsNeedsTheMeaningOfItsCurrentColumn) {
  const Capture capture = capture_of({channel("a", Unit::one, 2, {1, 2, 3}), channel("b", Unit::one, 3, {4, 5, 6})});
  EXPECT_FALSE(driven_record(capture, {}, {}));
  BenchSetup bench;
  bench.current.gain = StatedValue::exact(1, Unit::one);
  const auto record = driven_record(capture, bench, {});
  ASSERT_TRUE(record) << record.error().finding;
  EXPECT_THAT(record->amps, ElementsAre(4, 5, 6));
}

TEST(DrivenCapture, OneColumnIsNotEnough) {
  const auto record = driven_record(capture_of({channel("CH1", Unit::volt, 2, {1, 2, 3})}), {}, {});
  ASSERT_FALSE(record);
  EXPECT_EQ(record.error().problem, Problem::missing_column);
}

TEST(DrivenCapture, WhatIsNotStatedEntersAsADefaultUnlessTheBenchIsExact) {
  BenchSetup bench;
  bench.current.shunt = StatedValue::unstated(0.1, Unit::ohm);
  const auto record = driven_record(two_volts(), bench, {});
  ASSERT_TRUE(record);
  EXPECT_THAT(record->errors.skew.basis, HasSubstr("default"));
  EXPECT_NEAR(record->errors.skew.law.standard_uncertainty, 2e-9 / std::sqrt(3.0), 1e-15);
  EXPECT_NEAR(record->errors.shunt_tau.law.standard_uncertainty, 50e-9 / std::sqrt(3.0), 1e-12);
  const auto exact = driven_record(two_volts(), bench, {.exact_bench = true});
  ASSERT_TRUE(exact);
  for (const InputError* e : {&exact->errors.voltage_gain, &exact->errors.current_gain, &exact->errors.skew,
                              &exact->errors.shunt_tau, &exact->errors.timebase}) {
    EXPECT_EQ(e->law.standard_uncertainty, 0) << e->source;
  }
}

TEST(DrivenCapture, UnevenStepsOfBothColumnsAreResampledOnOneGrid) {
  std::vector<double> times, v, i;
  for (int n = 0; n < 60; ++n) {
    times.push_back(1e-6 * (n + 0.2 * std::sin(n)));
    v.push_back(3 * times.back() * 1e6 + 1);
    i.push_back(-2 * times.back() * 1e6);
  }
  v[0] = std::nan("");   // the grid of the other column begins later, too
  Capture capture = capture_of({channel("v", Unit::volt, 2, v), channel("i", Unit::ampere, 3, i)});
  capture.time = {std::nan(""), std::nan(""), times};
  const auto record = driven_record(capture, {}, {});
  ASSERT_TRUE(record) << record.error().finding;
  ASSERT_EQ(record->volts.size(), record->amps.size());
  for (std::size_t n = 0; n < record->volts.size(); ++n) {
    EXPECT_NEAR(record->volts[n], 1 - 1.5 * record->amps[n], 1e-9);
  }
  ASSERT_EQ(record->findings.size(), 1u);
  EXPECT_EQ(record->findings[0].code, "uneven_step");
}

// A steady sine taken through delay, shunt and probe comes back by the inverse chain, in frequency and in time alike.
TEST(DrivenCapture, TheChainIsTakenOutInTimeAsInFrequency) {
  DrivenRecord record;
  record.step_s = 1e-7;
  record.skew_s = 0.37e-7;
  record.shunt_tau_s = 3e-7;
  record.probe_corner_hz = 40;
  const double omega = 2 * std::numbers::pi * 20e3;
  const std::complex<double> chain = current_chain(omega, record.skew_s, record.shunt_tau_s, record.probe_corner_hz);
  for (int n = 0; n < 20000; ++n) {
    const double t = record.step_s * n;
    record.volts.push_back(0);
    record.amps.push_back((chain * std::polar(1.0, omega * t)).real());
  }
  const DrivenRecord corrected = corrected_in_time(record);
  EXPECT_EQ(corrected.skew_s, 0);
  EXPECT_EQ(corrected.probe_corner_hz, 0);
  // The droop's integral begins at an arbitrary phase: a constant is left, and the shunt's start dies away.
  double mean = 0;
  for (std::size_t n = 1000; n < 6000; ++n) mean += (corrected.amps[n] - std::cos(omega * record.step_s * static_cast<double>(n))) / 5000;
  EXPECT_LT(std::fabs(mean), 2 * record.probe_corner_hz / 20e3);
  for (std::size_t n = 1000; n < 19000; n += 37) {
    const double truth = std::cos(omega * record.step_s * static_cast<double>(n));
    EXPECT_NEAR(corrected.amps[n] - mean, truth, 1e-4) << n;
  }
}

TEST(DrivenCapture, AShiftByWholeSamplesLosesOnlyTheEnd) {
  DrivenRecord record;
  record.step_s = 1e-7;
  record.skew_s = 2e-7;
  record.volts = {0, 0, 0, 0, 0};
  record.amps = {1, 2, 3, 4, 5};
  const DrivenRecord corrected = corrected_in_time(record);
  EXPECT_DOUBLE_EQ(corrected.amps[0], 3);
  EXPECT_DOUBLE_EQ(corrected.amps[2], 5);
  EXPECT_TRUE(std::isnan(corrected.amps[3]));
}

}  // namespace
}  // namespace coilassay

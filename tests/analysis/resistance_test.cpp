#include "analysis/resistance.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <string>

#include "acquire/synthetic/driven_resistance.h"
#include "base/random.h"

namespace coilassay::test {
namespace {

using synthetic::DrivenResistanceBench;
using testing::HasSubstr;

synthetic::DrivenResistanceRecord simulated(const DrivenResistanceBench& bench) {
  auto record = synthetic::simulate_driven_resistance(bench);
  EXPECT_TRUE(record) << (record ? "" : record.error().finding);
  return std::move(*record);
}

Measurement measured(const std::vector<Capture>& captures, const ResistanceRequest& request) {
  auto result = measure_resistance(captures, request);
  EXPECT_TRUE(result) << (result ? "" : result.error().finding);
  return result ? std::move(*result) : Measurement{};
}

/// A current of 1 A exactly would look like that of a meter with four digits: it varies a little.
Measurement measured(DrivenResistanceBench bench, const ResistanceRequest& request) {
  if (bench.current_noise_a == 0) bench.current_noise_a = 1e-3 * bench.current_a;
  return measured({simulated(bench).capture}, request);
}

ResistanceRequest exact_request() {
  ResistanceRequest request;
  request.propagation.exact_bench = true;
  return request;
}

const Finding* finding(const Measurement& result, std::string_view code) {
  for (const Finding& f : result.findings) {
    if (f.code == code) return &f;
  }
  return nullptr;
}

bool covers(const Estimate* e, double truth) { return e != nullptr && e->low <= truth && truth <= e->high; }

Capture readings(const std::vector<double>& volts, const std::vector<double>& amps) {
  Capture capture;
  capture.source.name = "readings.csv";
  capture.channels.resize(2);
  capture.channels[0] = {.name = "V", .unit = Unit::volt, .unit_stated = true, .column = 1, .samples = volts};
  capture.channels[1] = {.name = "I", .unit = Unit::ampere, .unit_stated = true, .column = 2, .samples = amps};
  return capture;
}

// 0.35 ohm at 20 degC is 0.35 (1 + 0.00393 * 3) at 23 degC; an offset of 80 uV is 0.02 % of the voltage.
TEST(Resistance, TakesOutTheThermalOffsetWithBothPolarities) {
  DrivenResistanceBench bench{.thermal_offset_v = 80e-6, .noise_v = 2e-6};
  const Measurement result = measured(bench, exact_request());
  const Estimate* r = result.find("R_dc");
  ASSERT_NE(r, nullptr);
  EXPECT_TRUE(covers(r, 0.35 * (1 + 0.00393 * 3)));
  EXPECT_LT(r->half_width(), 2e-6);
  ASSERT_TRUE(result.model);
  EXPECT_NEAR(result.model->parameters.at("thermal_offset").value, 80e-6, 2e-6);
  EXPECT_EQ(finding(result, "thermal_offset"), nullptr);
}

TEST(Resistance, WithOnePolaritySaysThatTheOffsetIsNotRemovedAndAllowsForIt) {
  DrivenResistanceBench bench{.current_a = 0.1, .one_polarity = true, .thermal_offset_v = 8e-6, .noise_v = 1e-7};
  ResistanceRequest request;
  request.bench.voltage.gain = StatedValue::exact(1, Unit::one);
  request.bench.current.gain = StatedValue::exact(1, Unit::one);
  const Measurement result = measured(bench, request);
  const Estimate* r = result.find("R_dc");
  ASSERT_NE(r, nullptr);
  EXPECT_TRUE(covers(r, 0.35 * (1 + 0.00393 * 3)));
  EXPECT_NEAR(r->half_width(), 0.95 * 10e-6 / 0.1, 3e-6);
  ASSERT_NE(finding(result, "thermal_offset"), nullptr);
  EXPECT_EQ(result.budget.at("R_dc").front().source, "thermal offset");
  // Without default tolerances the offset stays in the value, and the finding says that nothing is allowed for it.
  const Measurement exact = measured(bench, exact_request());
  ASSERT_NE(finding(exact, "thermal_offset"), nullptr);
  EXPECT_NEAR(exact.find("R_dc")->quantity.value, 0.35 * (1 + 0.00393 * 3) + 80e-6, 2e-6);
}

TEST(Resistance, ReadingsWithTheCurrentOffServeAsTheOtherSide) {
  const Measurement result = measured({readings({8e-6, 0.100008, 9e-6, 0.100007, 7e-6, 0.100009}, {0, 0.2, 0, 0.2, 0, 0.2})},
                                      exact_request());
  EXPECT_NEAR(result.find("R_dc")->quantity.value, 0.5, 1e-5);
  EXPECT_EQ(finding(result, "thermal_offset"), nullptr);
}

TEST(Resistance, TakesTwoCapturesOneForEachPolarity) {
  DrivenResistanceBench bench{.thermal_offset_v = 1e-3, .noise_v = 1e-4, .readings = 40};
  bench.before_reversal = 20;
  const auto whole = simulated(bench).capture;
  Capture forward = whole, reverse = whole;
  for (Channel& c : forward.channels) c.samples.resize(20);
  for (Channel& c : reverse.channels) c.samples.erase(c.samples.begin(), c.samples.begin() + 20);
  const Measurement together = measured({whole}, exact_request());
  const Measurement apart = measured({forward, reverse}, exact_request());
  EXPECT_DOUBLE_EQ(apart.find("R_dc")->quantity.value, together.find("R_dc")->quantity.value);
  EXPECT_EQ(apart.sources.size(), 2u);
}

TEST(Resistance, NoticesAWindingThatWarmsAndCoversBothEnds) {
  DrivenResistanceBench bench{.resistance_20_ohm = 2, .thermal_resistance_k_per_w = 10, .thermal_time_s = 60, .current_noise_a = 1e-3, .noise_v = 1e-4};
  const auto record = simulated(bench);
  ASSERT_GT(record.truth.warming_k, 5);
  const Measurement result = measured({record.capture}, exact_request());
  const Finding* warming = finding(result, "warming");
  ASSERT_NE(warming, nullptr);
  EXPECT_EQ(warming->severity, Severity::caution);
  EXPECT_NEAR(warming->figure, 0.00393 * record.truth.warming_k, 0.25 * 0.00393 * record.truth.warming_k);
  EXPECT_TRUE(covers(result.find("R_dc"), record.truth.r_dc_ohm));
  EXPECT_TRUE(covers(result.find("R_dc"), record.truth.r_dc_last_ohm));
}

TEST(Resistance, OfAWindingAtRestRaisesNoWarming) {
  int alarms = 0;
  for (std::uint64_t seed = 1; seed <= 300; ++seed) {
    Random random(seed, 4);
    DrivenResistanceBench bench;
    bench.resistance_20_ohm = std::pow(10, random.uniform(-2, 2));
    bench.thermal_offset_v = random.uniform(-1e-5, 1e-5);
    bench.noise_v = bench.resistance_20_ohm * std::pow(10, random.uniform(-5, -2));
    bench.readings = 6 + random.below(60);
    bench.before_reversal = 1 + random.below(bench.readings / 2);
    if (seed % 3 == 0) bench.digit_v = bench.noise_v * random.uniform(0.1, 5);
    bench.seed = seed;
    ResistanceRequest request;
    request.bench.temperature = StatedValue::rectangular(23, 1, Unit::degree_celsius);
    const Measurement result = measured(bench, request);
    EXPECT_NE(result.find("R_dc"), nullptr);
    for (const Finding& f : result.findings) {
      if (f.severity != Severity::note && f.code != "thermal_offset") ++alarms;
    }
  }
  EXPECT_LE(alarms, 3);
}

TEST(Resistance, At20DegreesFollowsTheLawOfTheMetal) {
  DrivenResistanceBench bench{.temperature_degc = 35, .noise_v = 1e-7};
  ResistanceRequest request = exact_request();
  request.bench.temperature = StatedValue::rectangular(35, 1, Unit::degree_celsius);
  Measurement result = measured(bench, request);
  EXPECT_TRUE(covers(result.find("R_dc_20"), 0.35));
  // One kelvin either way is 0.00393/(1 + 0.00393*15) of it, rectangular.
  EXPECT_NEAR(result.find("R_dc_20")->half_width(), 0.95 * 0.35 * 0.00393 / (1 + 0.00393 * 15), 1e-5);
  EXPECT_EQ(finding(result, "temperature_unknown"), nullptr);

  request.metal = aluminium();
  result = measured(bench, request);
  EXPECT_NEAR(result.find("R_dc_20")->quantity.value, 0.35 * (1 + 0.00393 * 15) / (1 + 0.00403 * 15), 1e-6);
}

TEST(Resistance, WithoutATemperatureThereIsNoValueAt20DegreesAndItIsSaid) {
  const Measurement result = measured(DrivenResistanceBench{.noise_v = 1e-6}, exact_request());
  EXPECT_NE(result.find("R_dc"), nullptr);
  EXPECT_EQ(result.find("R_dc_20"), nullptr);
  const Finding* unknown = finding(result, "temperature_unknown");
  ASSERT_NE(unknown, nullptr);
  EXPECT_EQ(unknown->severity, Severity::note);
  EXPECT_THAT(unknown->message, HasSubstr("--temperature"));
}

TEST(Resistance, NoiseOfTheCurrentReadingsDoesNotPullTheResistanceDown) {
  DrivenResistanceBench bench{.noise_a = 0.1, .readings = 4000};
  const Measurement result = measured(bench, exact_request());
  // Least squares would lose 1 %; the scatter leaves 0.16 %.
  const Estimate* r = result.find("R_dc");
  EXPECT_NEAR(r->quantity.value, 0.35 * (1 + 0.00393 * 3), 3 * r->quantity.standard_uncertainty);
  EXPECT_LT(r->quantity.standard_uncertainty, 0.003 * 0.35);
}

TEST(Resistance, RippleOfTheCurrentItselfCostsNothing) {
  DrivenResistanceBench bench{.current_noise_a = 0.01, .noise_v = 1e-6};
  const Measurement result = measured(bench, exact_request());
  EXPECT_LT(result.find("R_dc")->quantity.standard_uncertainty, 2e-6);
  EXPECT_TRUE(covers(result.find("R_dc"), 0.35 * (1 + 0.00393 * 3)));
}

TEST(Resistance, OfReadingsThatDoNotScatterIsNoBetterThanTheirLastDigit) {
  // 0.35413 ohm at 1 A seen through a meter of 1 mV: always 0.354 and -0.354.
  DrivenResistanceBench bench{.digit_v = 1e-3};
  const Measurement result = measured(bench, exact_request());
  const Estimate* r = result.find("R_dc");
  EXPECT_TRUE(covers(r, 0.35 * (1 + 0.00393 * 3)));
  EXPECT_NEAR(r->half_width(), 0.475e-3, 0.05e-3);
  EXPECT_EQ(result.budget.at("R_dc").front().source, "last digit of the voltage");
}

TEST(Resistance, MetersOfUnstatedAccuracyGetADefaultWithItsReason) {
  const Measurement result = measured(DrivenResistanceBench{.noise_v = 1e-6}, {});
  const auto& lines = result.budget.at("R_dc");
  ASSERT_GE(lines.size(), 2u);
  EXPECT_EQ(lines[0].source, "current gain");
  EXPECT_THAT(lines[0].basis, HasSubstr("default: ±1.0 %, a hand-held meter"));
  EXPECT_EQ(lines[1].source, "voltage gain");
  EXPECT_NEAR(lines[1].u / (0.35 * (1 + 0.00393 * 3)), 0.005 / std::sqrt(3.0), 1e-6);
  // Samples some microseconds apart are those of an oscilloscope.
  const Measurement scope = measured(DrivenResistanceBench{.noise_v = 1e-6, .interval_s = 1e-6}, {});
  EXPECT_THAT(scope.budget.at("R_dc")[0].basis, HasSubstr("±2.0 %"));
}

TEST(Resistance, ThroughAShuntNeedsItsValue) {
  DrivenResistanceBench bench{.noise_v = 1e-6, .shunt_ohm = 0.1};
  ResistanceRequest request;
  const auto refused = measure_resistance({simulated(bench).capture}, request);
  ASSERT_FALSE(refused);
  EXPECT_THAT(refused.error().remedy, HasSubstr("--shunt"));
  request.bench.current.shunt = StatedValue::rectangular(0.1, 0.0005, Unit::ohm);
  request.bench.voltage.gain = StatedValue::exact(1, Unit::one);
  const Measurement result = measured(bench, request);
  EXPECT_TRUE(covers(result.find("R_dc"), 0.35 * (1 + 0.00393 * 3)));
  EXPECT_NEAR(result.find("R_dc")->half_width(), 0.95 * 0.005 * 0.354, 2e-5);
}

TEST(Resistance, RefusesWhatHoldsNone) {
  const Measurement none = measured({readings({1e-6, 2e-6, 1e-6}, {0, 0, 0})}, {});
  EXPECT_EQ(none.find("R_dc"), nullptr);
  ASSERT_NE(finding(none, "no_current"), nullptr);

  const Measurement one = measured({readings({0.35}, {1})}, {});
  EXPECT_EQ(one.find("R_dc"), nullptr);
  ASSERT_NE(finding(one, "too_few_samples"), nullptr);

  const Measurement swapped = measured({readings({-0.35, 0.35, -0.351, 0.351}, {1, -1, 1, -1})}, {});
  EXPECT_EQ(swapped.find("R_dc"), nullptr);
  ASSERT_NE(finding(swapped, "negative_resistance"), nullptr);

  const Measurement noise = measured({readings({2e-6, 3e-6, -4e-6, 5e-6, -1e-6, -3e-6}, {1, -1, 1, -1, 1, -1})}, {});
  EXPECT_EQ(noise.find("R_dc"), nullptr);
  EXPECT_NE(finding(noise, "resistance_unresolved"), nullptr);
}

TEST(Resistance, LeavesOutReadingsWithEitherNumberMissing) {
  const double nan = std::nan("");
  const std::vector<double> volts{0.5001, -0.4999, nan, 0.5, -0.5, 0.4999}, amps{1, -1, 1, nan, -1, 1};
  const Measurement result = measured({readings(volts, amps)}, exact_request());
  const Measurement kept = measured({readings({0.5001, -0.4999, -0.5, 0.4999}, {1, -1, -1, 1})}, exact_request());
  EXPECT_DOUBLE_EQ(result.find("R_dc")->quantity.value, kept.find("R_dc")->quantity.value);
  const Measurement nothing = measured({readings({nan, nan, nan}, {1, -1, 1})}, exact_request());
  EXPECT_NE(finding(nothing, "too_few_samples"), nullptr);
}

// A fixed-seed sample of tests/proof/resistance_coverage.cpp: 400 intervals of nominal 95 %.
TEST(Resistance, IntervalsCoverAsOftenAsTheySay) {
  int covered = 0;
  for (std::uint64_t seed = 1; seed <= 400; ++seed) {
    Random random(seed, 8);
    DrivenResistanceBench bench;
    bench.thermal_offset_v = random.uniform(-1e-5, 1e-5);
    bench.noise_v = std::pow(10, random.uniform(-5, -3));
    bench.noise_a = std::pow(10, random.uniform(-5, -3));
    bench.readings = 4 + random.below(30);
    bench.before_reversal = 1 + random.below(bench.readings / 2);
    bench.seed = seed;
    const auto record = simulated(bench);
    covered += covers(measured({record.capture}, exact_request()).find("R_dc"), record.truth.r_dc_ohm);
  }
  // Standard deviation of the count is 4.4.
  EXPECT_GE(covered, 367);
  EXPECT_LE(covered, 393);
}

}  // namespace
}  // namespace coilassay::test

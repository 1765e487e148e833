// What a careful colleague would notice about a ramp: planted, and found; and left alone when there is nothing.
#include <gtest/gtest.h>

#include <algorithm>
#include <array>
#include <map>
#include <string>
#include <vector>

#include "analysis/cautions.h"
#include "analysis/ramp.h"
#include "tests/support/ramp_bench.h"

namespace coilassay {
namespace {

using synthetic::CoreKind;
using synthetic::DrivenRampBench;

Measurement measured(const DrivenRampBench& bench, RampRequest request) {
  return test::measured(test::simulated(bench).capture, request);
}
Measurement measured(const DrivenRampBench& bench) { return measured(bench, test::exact_request(bench)); }

bool says(const Measurement& m, const char* code, Severity severity) {
  const Finding* f = test::finding(m, code);
  return f != nullptr && f->severity == severity;
}

TEST(RampFindings, CleanRecordsRaiseNoAlarm) {
  // At most 3 cautions or refusals in 300 records: here 60.
  int alarms = 0;
  for (std::uint64_t s = 1; s <= 60; ++s) {
    const CoreKind kind =
        std::array{CoreKind::knee, CoreKind::tanh, CoreKind::powder, CoreKind::ferrite, CoreKind::rising}[s % 5];
    const Measurement m = measured(test::coarse_bench(kind, 500 + s));
    const bool alarm = std::any_of(m.findings.begin(), m.findings.end(),
                                   [](const Finding& f) { return f.severity != Severity::note; });
    alarms += alarm || m.find("I_sat_30") == nullptr ? 1 : 0;
  }
  EXPECT_LE(alarms, 1);
}

// 2 J at 20 A, an open end, a shunt on an earthed scope: each with its own number.
TEST(RampCautions, SayEnergyFlybackHeatAndWhereTheShuntMustSit) {
  const std::vector<Caution> cautions = ramp_cautions({.peak_a = 20,
                                                       .energy_j = 2,
                                                       .inductance_h = 10e-3,
                                                       .fall_seen = false,
                                                       .winding_j = 0.3,
                                                       .shunt_j = 0.05,
                                                       .period_s = 0.1,
                                                       .shares_earth = true});
  std::map<std::string, const Caution*> by_code;
  for (const Caution& c : cautions) by_code[c.code] = &c;
  ASSERT_EQ(by_code.size(), 5u);
  EXPECT_EQ(by_code.at("stored_energy")->severity, Severity::caution);   // nothing is refused: it has been measured
  EXPECT_NE(by_code.at("stored_energy")->message.find("stop"), std::string::npos);
  EXPECT_NEAR(by_code.at("flyback")->figure, 20 * 1e4, 1);   // I sqrt(L/C), 10 mH into 100 pF
  EXPECT_NE(by_code.at("pulse_heating")->message.find("3.0 W"), std::string::npos);
  EXPECT_EQ(by_code.at("shunt_energy")->figure, 0.05);
  EXPECT_EQ(by_code.at("earthed_scope")->figure, 20);
}

TEST(RampFindings, AKneeThatIsNotReachedIsABound) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::ferrite);
  bench.peak_current_a = 6;
  bench.current_full_scale_a = 8;
  bench.current_noise_a = 0.5 * 8.0 / 128;
  const Measurement m = measured(bench);
  EXPECT_TRUE(says(m, "knee_not_reached", Severity::note));
  EXPECT_EQ(m.find("I_sat_30"), nullptr);
  ASSERT_NE(m.find("L_0"), nullptr);
  const auto bound = std::find_if(m.bounds.begin(), m.bounds.end(), [](const Bound& b) { return b.symbol == "I_sat_30"; });
  ASSERT_NE(bound, m.bounds.end());
  EXPECT_NEAR(*bound->at_least, 6, 0.1);
}

TEST(RampFindings, SagIsCalledSagAndNotSaturation) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::ferrite);
  bench.peak_current_a = 7;
  bench.switch_resistance_ohm = 0.3;
  const Measurement m = measured(bench);
  ASSERT_TRUE(says(m, "slope_falls", Severity::note));
  EXPECT_NE(test::finding_or_none(m, "slope_falls").message.find("sags"), std::string::npos);
  EXPECT_EQ(m.find("I_sat_10"), nullptr);
  EXPECT_NEAR(m.find("L_0")->quantity.value, 10e-6, 0.02 * 10e-6);
}

TEST(RampFindings, VoltageTakenAtTheSupplyRefusesTheKnee) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::ferrite);
  bench.peak_current_a = 8;
  bench.switch_resistance_ohm = 0.6;
  bench.voltage_at_supply = true;
  const Measurement m = measured(bench);
  EXPECT_TRUE(says(m, "slope_falls", Severity::caution));
  EXPECT_EQ(m.find("I_sat_30"), nullptr);
  EXPECT_TRUE(m.bounds.empty());
}

TEST(RampFindings, ASwitchAtItsLimitIsSeen) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::ferrite);
  bench.current_limit_a = 5;
  bench.drive_time_s = 12e-6;
  bench.current_full_scale_a = 8;
  const Measurement m = measured(bench);
  ASSERT_NE(test::finding(m, "slope_falls"), nullptr);
  EXPECT_NE(test::finding_or_none(m, "slope_falls").message.find("limit"), std::string::npos);
  EXPECT_EQ(m.find("I_sat_10"), nullptr);
}

TEST(RampFindings, OffsetsAreTakenOutAndNamed) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  bench.current_offset_a = 0.4;
  bench.voltage_offset_v = -0.3;
  const auto record = test::simulated(bench);
  const Measurement m = test::measured(record.capture, test::exact_request(bench));
  EXPECT_TRUE(says(m, "zero_offset", Severity::note));
  const Estimate* knee = m.find("I_sat_20");
  ASSERT_NE(knee, nullptr);
  EXPECT_NEAR(knee->quantity.value, record.truth.i_sat_a[1], 4 * knee->quantity.standard_uncertainty);
}

TEST(RampFindings, AnUnknownResistanceWidensTheInterval) {
  const DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  const Measurement known = measured(bench);
  RampRequest request;
  request.propagation.exact_bench = true;
  const Measurement unknown = measured(bench, request);
  EXPECT_TRUE(says(unknown, "resistance_unresolved", Severity::caution));
  EXPECT_GT(unknown.find("I_sat_30")->half_width(), 2 * known.find("I_sat_30")->half_width());
}

TEST(RampFindings, ADroopingProbeIsSeenAfterThePulseAndTakenOutWhenStated) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  bench.freewheel = true;
  bench.diode_v = 3;
  bench.samples = 20000;
  bench.probe_corner_hz = 400;
  const auto record = test::simulated(bench);
  const Measurement plain = test::measured(record.capture, test::exact_request(bench));
  EXPECT_TRUE(says(plain, "probe_droop", Severity::caution));
  RampRequest request = test::exact_request(bench);
  request.bench.current.probe_corner = StatedValue::exact(400, Unit::hertz);
  const Measurement corrected = test::measured(record.capture, request);
  EXPECT_EQ(test::finding(corrected, "probe_droop"), nullptr);
  const Estimate* knee = corrected.find("I_sat_30");
  ASSERT_NE(knee, nullptr);
  EXPECT_NEAR(knee->quantity.value, record.truth.i_sat_a[2], 4 * knee->quantity.standard_uncertainty);
}

TEST(RampFindings, TheInductanceOfAShuntShowsAsAStep) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  bench.shunt_ohm = 0.01;
  bench.shunt_inductance_h = 5e-9;   // 0.5 us: half an ampere at once
  const Measurement m = measured(bench);
  ASSERT_TRUE(says(m, "shunt_inductance", Severity::caution));
  EXPECT_NEAR(test::finding_or_none(m, "shunt_inductance").figure, 5e-9, 1e-9);
  RampRequest request = test::exact_request(bench);
  request.bench.current.shunt_inductance = StatedValue::exact(5e-9, Unit::henry);
  EXPECT_EQ(test::finding(measured(bench, request), "shunt_inductance"), nullptr);
}

TEST(RampFindings, AFluxThatDoesNotCloseQuestionsTheResistance) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  bench.freewheel = true;
  bench.diode_v = 2;
  bench.samples = 20000;
  RampRequest request = test::exact_request(bench);
  EXPECT_EQ(test::finding(measured(bench, request), "flux_not_closed"), nullptr);
  request.bench.winding_resistance = StatedValue::rectangular(0.1, 0.005, Unit::ohm);
  EXPECT_TRUE(says(measured(bench, request), "flux_not_closed", Severity::caution));
}

TEST(RampFindings, AFirstPulseThatDiffersIsRemanence) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  bench.freewheel = true;
  bench.diode_v = 4;
  bench.pulses = 3;
  bench.samples = 30000;
  bench.first_pulse_ratio = 1.06;
  const auto record = test::simulated(bench);
  const Measurement m = test::measured(record.capture, test::exact_request(bench));
  EXPECT_TRUE(says(m, "remanence", Severity::note));
  const Estimate* l = m.find("L_0");
  EXPECT_NEAR(l->quantity.value, 10e-6, 4 * l->quantity.standard_uncertainty);
}

TEST(RampFindings, AnInductanceThatRisesFirstIsSaid) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::rising, 4);
  const Measurement m = measured(bench);
  ASSERT_TRUE(says(m, "l_rises_first", Severity::note));
  EXPECT_NE(m.find("I_sat_10"), nullptr);
}

TEST(RampFindings, AClippedCurrentEndsTheCurve) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  bench.current_full_scale_a = 12;
  const auto record = test::simulated(bench);
  const Measurement m = test::measured(record.capture, test::exact_request(bench));
  EXPECT_TRUE(says(m, "clipped", Severity::caution));
  EXPECT_LT(*m.conditions.peak_current_a, 12);
  const Estimate* knee = m.find("I_sat_30");
  ASSERT_NE(knee, nullptr);
  EXPECT_NEAR(knee->quantity.value, record.truth.i_sat_a[2], 4 * knee->quantity.standard_uncertainty);
}

TEST(RampFindings, AClippedVoltageLeavesNothing) {
  DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  bench.voltage_full_scale_v = 8;
  const Measurement m = measured(bench);
  EXPECT_TRUE(says(m, "clipped", Severity::refusal));
  EXPECT_EQ(m.find("L_0"), nullptr);
}

TEST(RampFindings, SwappedChannelsAreRefused) {
  const DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  auto record = test::simulated(bench);
  std::swap(record.capture.channels[0].samples, record.capture.channels[1].samples);
  std::swap(record.capture.channels[0].resolution, record.capture.channels[1].resolution);
  std::swap(record.capture.channels[0].full_scale, record.capture.channels[1].full_scale);
  const Measurement m = test::measured(record.capture, test::exact_request(bench));
  EXPECT_TRUE(says(m, "scale_suspect", Severity::refusal));
  EXPECT_EQ(m.find("L_0"), nullptr);
}

TEST(RampFindings, ACurrentThatNeverRisesIsRefused) {
  const DrivenRampBench bench = test::coarse_bench(CoreKind::knee, 4);
  auto record = test::simulated(bench);
  for (double& i : record.capture.channels[1].samples) i = 0;
  const Measurement m = test::measured(record.capture, test::exact_request(bench));
  EXPECT_TRUE(says(m, "no_ramp", Severity::refusal));
  EXPECT_EQ(m.find("L_0"), nullptr);
}

}  // namespace
}  // namespace coilassay

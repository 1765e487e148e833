// A value measured at other conditions than the limit's never passes.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "inspection/verdict.h"
#include "tests/inspection/made_units.h"

namespace coilassay {
namespace {

using test::estimate;
using test::sheet_of;
using test::tested;
using testing::HasSubstr;

PartSheet sheet_at(const std::string& at, const std::string& quantity = "L_s", const std::string& limit = "min = \"40 uH\"") {
  return sheet_of("[part]\nname = \"drum\"\n[[limit]]\nquantity = \"" + quantity + "\"\n" + limit + "\nat = { " + at +
                  " }\n[tolerance_of_conditions]\nfrequency = \"1 %\"\nlevel = \"20 %\"\nbias = \"10 mA\"\ntemperature = \"3 degC\"\n");
}

LimitVerdict judged(const PartSheet& sheet, const TestedUnit& unit) { return judge_unit(sheet, "1", 1, std::vector{unit}).limits[0]; }

TestedUnit at_conditions(const Conditions& conditions) {
  TestedUnit unit = tested("sine", {estimate("L_s", 50e-6, 0.1e-6)});
  unit.measurement.conditions = conditions;
  return unit;
}

TEST(Conditions, EachThatTheLimitNamesMustFitWithinItsTolerance) {
  struct Row {
    const char* at;
    Conditions is;
    bool fits;
    const char* says;
  };
  const auto only = [](auto member, double value) {
    Conditions c;
    c.*member = value;
    return c;
  };
  for (const Row& row : {Row{"frequency = \"100 kHz\"", only(&Conditions::frequency_hz, 100.9e3), true, ""},
                         Row{"frequency = \"100 kHz\"", only(&Conditions::frequency_hz, 101.1e3), false, "frequency 101.1 kHz, stated 100 kHz"},
                         Row{"frequency = \"100 kHz\"", {}, false, "frequency is not known"},
                         Row{"level = \"100 mV\"", only(&Conditions::level_v, 0.119), true, ""},
                         Row{"level = \"100 mV\"", only(&Conditions::level_v, 0.125), false, "level"},
                         Row{"level = \"10 mA\"", only(&Conditions::level_v, 0.1), false, "level is not known"},
                         Row{"level = \"10 mA\"", only(&Conditions::level_a, 0.011), true, ""},
                         Row{"bias = \"0 A\"", only(&Conditions::bias_a, 0.01), true, ""},
                         Row{"bias = \"0 A\"", only(&Conditions::bias_a, 0.02), false, "bias"},
                         Row{"bias = \"0 A\"", {}, false, "bias is not known"},
                         Row{"temperature = \"20 degC\"", only(&Conditions::temperature_degc, 23), true, ""},
                         Row{"temperature = \"20 degC\"", only(&Conditions::temperature_degc, 24), false, "temperature"}}) {
    const LimitVerdict v = judged(sheet_at(row.at), at_conditions(row.is));
    EXPECT_EQ(v.verdict, row.fits ? Verdict::pass : Verdict::not_comparable) << row.at;
    EXPECT_THAT(v.why, HasSubstr(row.says)) << row.at;
    EXPECT_EQ(v.p_conform.has_value(), row.fits);
  }
}

TEST(Conditions, AUnitThatCannotBeComparedRaisesItsFinding) {
  const auto unit = judge_unit(sheet_at("frequency = \"100 kHz\""), "1", 1, std::vector{at_conditions({})});
  EXPECT_EQ(unit.verdict, Verdict::not_comparable);
  ASSERT_EQ(unit.findings.size(), 1u);
  EXPECT_EQ(unit.findings[0].code, "not_comparable");
  EXPECT_EQ(unit.findings[0].severity, Severity::refusal);
}

TEST(Conditions, ThePointNearestToTheStatedFrequencyCounts) {
  TestedUnit unit = tested("sweep", {});
  const auto add = [&](double hz, double henry) {
    Point point;
    point.at_hz = hz;
    point.from = "model";
    point.estimates.push_back(estimate("L_s", henry, 0.1e-6));
    unit.measurement.points.push_back(point);
  };
  add(99.5e3, 30e-6);
  add(100e3, 50e-6);
  add(200e3, 20e-6);
  const LimitVerdict v = judged(sheet_at("frequency = \"100 kHz\""), unit);
  EXPECT_EQ(v.verdict, Verdict::pass);
  EXPECT_EQ(*v.value, 50e-6);
  EXPECT_THAT(v.from, HasSubstr("model at 100"));
}

TEST(Conditions, TheDefinitionOfASaturationCurrentMustBeTheLimits) {
  const auto with = [](const std::string& symbol, const std::string& definition) {
    Estimate e = estimate(symbol, 1.5, 0.01);
    e.definition = definition;
    return e;
  };
  const std::vector both{with("I_sat_30", "ramp_incremental"), with("I_sat_30_secant", "ramp_secant")};
  const auto sheet = [](const std::string& d) { return sheet_at("definition = \"" + d + "\"", "I_sat_30", "min = \"1.2 A\""); };
  EXPECT_EQ(judged(sheet("ramp_incremental"), tested("ramp", both)).verdict, Verdict::pass);
  EXPECT_EQ(judged(sheet("ramp_secant"), tested("ramp", both)).verdict, Verdict::pass);
  const LimitVerdict other = judged(sheet("bias_small_signal"), tested("ramp", both));
  EXPECT_EQ(other.verdict, Verdict::not_comparable);
  EXPECT_THAT(other.why, HasSubstr("definition ramp_incremental"));
  // The bound of a ramp that did not reach its knee has the ramp's definition.
  TestedUnit bounded = tested("ramp", {});
  bounded.measurement.bounds.push_back({"I_sat_30", Unit::ampere, 1.6, std::nullopt, 0.95});
  EXPECT_EQ(judged(sheet("ramp_incremental"), bounded).verdict, Verdict::pass);
  EXPECT_EQ(judged(sheet("bias_small_signal"), bounded).verdict, Verdict::not_comparable);
}

TEST(Conditions, ResistanceAtTwentyDegreesIsAtTwentyDegrees) {
  const PartSheet sheet = sheet_at("temperature = \"20 degC\"", "R_dc_20", "max = \"1 ohm\"");
  TestedUnit unit = tested("resistance", {estimate("R_dc_20", 0.5, 0.001)});
  unit.measurement.conditions.temperature_degc = 35;
  EXPECT_EQ(judged(sheet, unit).verdict, Verdict::pass);
}

TEST(Conditions, ALimitThatNamesATestTakesNoOther) {
  const PartSheet sheet = sheet_of("[part]\nname = \"drum\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\ntest = \"sweep\"\n");
  const auto unit = judge_unit(sheet, "1", 1, std::vector{tested("ringdown", {estimate("L_s", 50e-6, 0.1e-6)})});
  EXPECT_EQ(unit.verdict, Verdict::undecided);
  EXPECT_THAT(unit.limits[0].why, HasSubstr("there is no sweep of this unit"));
}

TEST(Conditions, TheFirstTestThatCanBeComparedCounts) {
  const PartSheet sheet = sheet_at("frequency = \"100 kHz\"");
  TestedUnit ring = tested("ringdown", {estimate("L_s", 30e-6, 0.1e-6)}), sine = tested("sine", {estimate("L_s", 50e-6, 0.1e-6)});
  ring.measurement.conditions.frequency_hz = 232e3;
  sine.measurement.conditions.frequency_hz = 100e3;
  const auto unit = judge_unit(sheet, "1", 1, std::vector{ring, sine});
  EXPECT_EQ(unit.verdict, Verdict::pass);
  EXPECT_EQ(unit.limits[0].test, "sine");
}

TEST(Conditions, ARefusedMeasurementLeavesTheUnitUndecidedAndSaysWhy) {
  TestedUnit unit = tested("ringdown", {});
  unit.measurement.findings.push_back({"no_ringing", Severity::refusal, "nothing rings in this record", "", 0, Unit::one});
  const LimitVerdict v = judged(sheet_at("frequency = \"100 kHz\""), unit);
  EXPECT_EQ(v.verdict, Verdict::undecided);
  EXPECT_EQ(v.why, "nothing rings in this record");
}

TEST(Conditions, OneFailingLimitFailsTheUnitWhateverTheOthersSay) {
  const PartSheet sheet = sheet_of(
      "[part]\nname = \"drum\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\n[[limit]]\nquantity = \"Q\"\nmin = \"20\"\n"
      "at = { frequency = \"100 kHz\" }\n[[limit]]\nquantity = \"R_dc\"\nmax = \"1 ohm\"\n");
  const auto verdict = [&](double henry) {
    return judge_unit(sheet, "1", 1, std::vector{tested("ringdown", {estimate("L_s", henry, 1e-7), estimate("Q", 30, 0.1)})}).verdict;
  };
  EXPECT_EQ(verdict(30e-6), Verdict::fail);
  EXPECT_EQ(verdict(50e-6), Verdict::not_comparable);  // before undecided: R_dc was not measured
}

// Two repeats 49 and 51 uH of u 0.5 uH, all of it common: u_c = 0.5, s/sqrt(2) = 1, so u = sqrt(1.25) uH.
TEST(Conditions, RepeatsAreJudgedByTheirMean) {
  const PartSheet sheet = test::simple_sheet("guarded");
  const std::vector twice{tested("ringdown", {estimate("L_s", 49e-6, 0.5e-6)}), tested("ringdown", {estimate("L_s", 51e-6, 0.5e-6)})};
  const auto unit = judge_unit(sheet, "1", 1, twice);
  EXPECT_NEAR(*unit.limits[0].value, 50e-6, 1e-15);
  EXPECT_NEAR(*unit.limits[0].u, std::sqrt(1.25) * 1e-6, 1e-12);
  // t(0.975, 1) = 12.706 for the scatter, 1.96 for what is common.
  EXPECT_NEAR(*unit.limits[0].U, std::hypot(12.7062047 * 1e-6, 1.959963985 * 0.5e-6), 1e-11);
  EXPECT_THAT(unit.limits[0].from, HasSubstr("mean of 2"));
}

TEST(Conditions, OneRepeatAtOtherConditionsMakesTheLimitNotComparable) {
  TestedUnit right = tested("sine", {estimate("L_s", 50e-6, 0.1e-6)}), wrong = right, refused = tested("sine", {});
  right.measurement.conditions.frequency_hz = 100e3;
  wrong.measurement.conditions.frequency_hz = 1e3;
  const PartSheet sheet = sheet_at("frequency = \"100 kHz\"");
  EXPECT_EQ(judge_unit(sheet, "1", 1, std::vector{right, wrong}).verdict, Verdict::not_comparable);
  const auto two_of_three = judge_unit(sheet, "1", 1, std::vector{right, refused, right});
  EXPECT_EQ(two_of_three.verdict, Verdict::pass);
  EXPECT_THAT(two_of_three.limits[0].why, HasSubstr("1 of 3 repeats gave no value"));
}

TEST(Conditions, TheNearestBiasOfATableCounts) {
  TestedUnit unit = tested("sine", {});
  for (const auto& [amps, henry] : {std::pair{0.995, 30e-6}, {1.001, 50e-6}, {1.008, 20e-6}}) {
    Point point;
    point.bias_a = amps;
    point.estimates.push_back(estimate("L_s", henry, 0.1e-6));
    unit.measurement.points.push_back(point);
  }
  EXPECT_EQ(*judged(sheet_at("bias = \"1 A\""), unit).value, 50e-6);
}

TEST(Conditions, WhatRepeatsShareDoesNotAverageOut) {
  std::vector<TestedUnit> repeats;
  for (const double value : {50.01e-6, 49.99e-6, 50.0e-6, 50.0e-6}) {
    TestedUnit unit = tested("ringdown", {estimate("L_s", value, 0.5e-6)});
    unit.measurement.budget["L_s"] = {{"capacitor", 'B', 0.3e-6, 0.36, true, "stated"}, {"fit", 'A', 0.4e-6, 0.64, false, "data"}};
    repeats.push_back(unit);
  }
  const auto v = judge_unit(test::simple_sheet("guarded"), "1", 1, repeats).limits[0];
  EXPECT_NEAR(*v.u, std::hypot(0.3e-6, 0.2e-6), 1e-12);
  EXPECT_NEAR(*v.u_own, 0.2e-6, 1e-12);
}

}  // namespace
}  // namespace coilassay

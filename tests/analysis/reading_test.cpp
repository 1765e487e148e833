// An instrument's own values as measurements.
#include "analysis/reading.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>

#include "tests/support/instrument_bench.h"

namespace coilassay {
namespace {

using testing::HasSubstr;

InstrumentProfile profile_with(const std::string& more) {
  return test::parsed_profile("[link]\nkind = \"tcp\"\nport = \"localhost:1\"\n[reading]\nask = \"?\"\nfields = [\"L_s [H]\", \"R_s [ohm]\", \"status\"]\n"
                              "at = { frequency = \"100 kHz\", level = \"1 V\" }\n" + more);
}
Reading reply(const InstrumentProfile& profile, const std::string& line) {
  const auto reading = parse_reading(*profile.reading, line, "port");
  EXPECT_TRUE(reading);
  return reading ? *reading : Reading{};
}

// By hand: 0.2 % of 47 uH is 94 nH, rectangular; the last digit is 0.1 nH and does not count. One rectangular law:
// u = 94 nH/sqrt(3), U = 0.95 x 94 nH.
TEST(Reading, StatedAccuracyMakesTheInterval) {
  const InstrumentProfile profile = profile_with("accuracy = { L_s = \"0.2 %\", R_s = \"1 % + 2 mohm\" }\n");
  const Measurement m = measure_reading(reply(profile, "4.70000E-05,3.50000E-01,0"), profile, "bench-lcr,1");
  EXPECT_EQ(m.test, "reading");
  const Estimate* l = m.find("L_s");
  ASSERT_NE(l, nullptr);
  EXPECT_DOUBLE_EQ(l->quantity.value, 47e-6);
  EXPECT_NEAR(l->quantity.standard_uncertainty, 94e-9 / std::sqrt(3.0), 1e-11);
  EXPECT_NEAR(l->half_width(), 0.95 * 94e-9, 0.01 * 94e-9);
  EXPECT_EQ(l->at_hz, 1e5);
  EXPECT_NEAR(m.find("R_s")->quantity.standard_uncertainty, (0.0035 + 0.002) / std::sqrt(3.0), 1e-5);
  EXPECT_EQ(m.conditions.frequency_hz, 1e5);
  EXPECT_EQ(m.conditions.level_v, 1.0);
  EXPECT_FALSE(m.conditions.bias_a);
  EXPECT_TRUE(m.budget.at("L_s").front().common) << "the same error for every unit this instrument measures";
}

TEST(Reading, AnUnstatedAccuracyIsNotZero) {
  const InstrumentProfile profile = profile_with("");
  const Measurement m = measure_reading(reply(profile, "4.70000E-05,3.50000E-01,0"), profile, "");
  EXPECT_NEAR(m.find("L_s")->quantity.standard_uncertainty, 0.01 * 47e-6 / std::sqrt(3.0), 1e-10);
  EXPECT_THAT(m.budget.at("L_s").front().basis, HasSubstr("default"));
  const Measurement exact = measure_reading(reply(profile, "4.70000E-05,3.50000E-01,0"), profile, "", {}, true);
  EXPECT_NEAR(exact.find("L_s")->quantity.standard_uncertainty, 1e-10 / 2 / std::sqrt(3.0), 1e-13) << "the last digit remains";
}

TEST(Reading, WhatBelongsToTheFixtureIsTakenOff) {
  const InstrumentProfile profile = profile_with("subtract = { L_s = \"20 nH ± 5 nH\" }\naccuracy = { L_s = \"0.01 %\" }\n");
  const Measurement m = measure_reading(reply(profile, "4.70000E-05,3.50000E-01,0"), profile, "");
  EXPECT_NEAR(m.find("L_s")->quantity.value, 46.98e-6, 1e-15);
  ASSERT_EQ(m.corrections.size(), 1u);
  EXPECT_DOUBLE_EQ(m.corrections[0].value, 20e-9);
  // 5 nH and 4.7 nH, both rectangular.
  EXPECT_NEAR(m.find("L_s")->quantity.standard_uncertainty, std::hypot(5e-9, 4.7e-9) / std::sqrt(3.0), 1e-11);
}

TEST(Reading, OverRangeAndBadStatusAreNoValues) {
  const InstrumentProfile profile = profile_with("");
  const Measurement over = measure_reading(reply(profile, "9.9E37,0.35,0"), profile, "");
  EXPECT_EQ(over.find("L_s"), nullptr);
  EXPECT_TRUE(over.has_finding("over_range"));
  EXPECT_NE(over.find("R_s"), nullptr) << "the other value stands";
  const Measurement bad = measure_reading(reply(profile, "4.7E-5,0.35,3"), profile, "");
  EXPECT_TRUE(bad.estimates.empty());
  EXPECT_TRUE(bad.has_finding("bad_status"));
}

TEST(Reading, WhatTheInstrumentSaysOfItselfCounts) {
  const InstrumentProfile profile = profile_with("");
  const Reading reading = reply(profile, "4.7E-5,0.35,0");
  EXPECT_FALSE(measure_reading(reading, profile, "", {{"frequency", "+1.00000E+05"}, {"bias", "0.1"}}).has_finding("setting_contradicts"));
  EXPECT_EQ(measure_reading(reading, profile, "", {{"bias", "0.1"}}).conditions.bias_a, 0.1) << "the profile leaves it open";
  const Measurement other = measure_reading(reading, profile, "", {{"frequency", "1 kHz"}});
  EXPECT_TRUE(other.has_finding("setting_contradicts"));
  EXPECT_TRUE(other.estimates.empty());
}

TEST(Reading, AUnitThatDoesNotFitItsSymbolIsRefusedWithItsLine) {
  const auto profile = test::parsed_profile("[link]\nkind = \"tcp\"\nport = \"localhost:1\"\n[reading]\nask = \"?\"\nfields = [\"L_s [ohm]\"]\n");
  const auto refused = check_profile_symbols(profile, false);
  ASSERT_FALSE(refused);
  EXPECT_EQ(refused.error().problem, Problem::wrong_unit);
  EXPECT_EQ(refused.error().place, "meter.toml:6");
  EXPECT_THAT(refused.error().finding, HasSubstr("L_s is an inductance (H)"));
  const auto unknown = test::parsed_profile("[link]\nkind = \"tcp\"\nport = \"localhost:1\"\n[reading]\nask = \"?\"\nfields = [\"Ls [H]\"]\n");
  EXPECT_TRUE(check_profile_symbols(unknown, false)) << "written down under any name";
  const auto judged = check_profile_symbols(unknown, true);
  ASSERT_FALSE(judged);
  EXPECT_THAT(judged.error().remedy, HasSubstr("L_s"));
}

}  // namespace
}  // namespace coilassay

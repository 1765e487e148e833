// What inspection leaves in a ledger can be read again to the last digit.
#include "app/runs/unit_entry.h"

#include <gmock/gmock.h>

#include <nlohmann/json.hpp>

namespace coilassay::test {
namespace {

using Json = nlohmann::json;
using testing::ElementsAre;

PartSheet sheet_with_two_limits() {
  PartSheet sheet;
  sheet.path = "drum.toml";
  sheet.sha256 = std::string(64, 'a');
  sheet.name = "drum-47";
  sheet.revision = "C";
  sheet.supplier = "Reel Hall";
  Limit inductance;
  inductance.quantity = "L_s";
  inductance.unit = Unit::henry;
  inductance.min = 37.6e-6;
  inductance.at.frequency_hz = 230e3;
  Limit knee;
  knee.quantity = "I_sat_30";
  knee.unit = Unit::ampere;
  knee.min = 1.2;
  sheet.limits = {inductance, knee};
  return sheet;
}

InspectionSetting setting_of(const PartSheet& sheet) {
  return {&sheet, "0412", "Ada", "", "coilassay 0", *parse_utc_time("2026-03-04T10:22:00Z")};
}

UnitRun a_unit(const PartSheet& sheet) {
  UnitRun unit;
  unit.verdict = {"0017", 2, Verdict::not_comparable, {}, {}};
  LimitVerdict inductance;
  inductance.quantity = "L_s";
  inductance.unit = Unit::henry;
  inductance.test = "ringdown";
  inductance.at = sheet.limits[0].at;
  inductance.value = 0.1 + 0.2;  // no short decimal
  inductance.u = 1.0 / 3;
  inductance.u_own = 1e-300;
  inductance.U = 0.5;
  inductance.low = -1.25;
  inductance.min = 37.6e-6;
  inductance.guard = 0;
  inductance.p_conform = 0.999999999999;
  inductance.verdict = Verdict::pass;
  inductance.why = "inside";
  inductance.from = "measured";
  LimitVerdict knee;
  knee.quantity = "I_sat_30";
  knee.unit = Unit::ampere;
  knee.verdict = Verdict::not_comparable;
  knee.why = "no capture of the test ramp";
  unit.verdict.limits = {inductance, knee};
  unit.verdict.findings = {{"not_comparable", Severity::caution, "no ramp", "I_sat_30", 0.25, Unit::ampere}};
  Measurement measurement;
  measurement.test = "ringdown";
  SourceRecord source;
  source.source.name = "lot/0017.ringdown.csv";
  source.source.sha256 = std::string(64, 'b');
  SourceRecord unreadable;
  unreadable.source.name = "lot/0017.gone.csv";
  measurement.sources = {source, unreadable};
  measurement.tables = {{"curve", {{"current_A", Unit::ampere, {1, 2}}}}};
  unit.tests = {{"ringdown", "ringdown", "bench.toml", std::string(64, 'c'), measurement}};
  unit.reason = "reseated";
  return unit;
}

TEST(UnitEntry, ComesBackToTheLastDigit) {
  const PartSheet sheet = sheet_with_two_limits();
  const UnitRun unit = a_unit(sheet);
  const EntryContent entry = unit_entry(unit, setting_of(sheet));
  const auto body = body_of(entry);
  ASSERT_TRUE(body) << body.error().finding;
  const auto again = content_of(*body);
  ASSERT_TRUE(again) << again.error().finding;
  EXPECT_EQ(again->reason, "reseated");
  EXPECT_EQ(again->operator_name, "Ada");
  EXPECT_THAT(again->sources, ElementsAre(EntrySource{"ringdown", "lot/0017.ringdown.csv", std::string(64, 'b')}))
      << "a file without digest is no source";

  const auto verdict = verdict_of_entry(*again, sheet);
  ASSERT_TRUE(verdict) << verdict.error().finding;
  EXPECT_EQ(verdict->serial, "0017");
  EXPECT_EQ(verdict->attempt, 2u);
  EXPECT_EQ(verdict->verdict, Verdict::not_comparable);
  ASSERT_EQ(verdict->limits.size(), 2u);
  const LimitVerdict& l = verdict->limits[0];
  const LimitVerdict& was = unit.verdict.limits[0];
  EXPECT_EQ(l.value, was.value);
  EXPECT_EQ(l.u, was.u);
  EXPECT_EQ(l.u_own, was.u_own);
  EXPECT_EQ(l.U, was.U);
  EXPECT_EQ(l.low, was.low);
  EXPECT_EQ(l.high, std::nullopt);
  EXPECT_EQ(l.guard, was.guard);
  EXPECT_EQ(l.p_conform, was.p_conform);
  EXPECT_EQ(l.at.frequency_hz, 230e3);
  EXPECT_EQ(l.why, "inside");
  EXPECT_EQ(l.test, "ringdown");
  EXPECT_EQ(verdict->limits[1].verdict, Verdict::not_comparable);
  EXPECT_FALSE(verdict->limits[1].value);
  ASSERT_EQ(verdict->findings.size(), 1u);
  EXPECT_EQ(verdict->findings[0].figure, 0.25);
  EXPECT_EQ(verdict->findings[0].unit, Unit::ampere);
  EXPECT_EQ(verdict->findings[0].about, "I_sat_30");
}

TEST(UnitEntry, HoldsTheMeasurementWithoutTablesForFigures) {
  const PartSheet sheet = sheet_with_two_limits();
  const Json details = Json::parse(unit_entry(a_unit(sheet), setting_of(sheet)).details);
  const Json& test = details.at("tests").at(0);
  EXPECT_EQ(test.at("result").at("schema"), "coilassay.result/1");
  EXPECT_FALSE(test.at("result").contains("curve"));
  EXPECT_EQ(test.at("bench").at("sha256"), std::string(64, 'c'));
}

TEST(UnitEntry, OfAnotherSheetGivesNoVerdict) {
  PartSheet sheet = sheet_with_two_limits();
  const EntryContent entry = unit_entry(a_unit(sheet), setting_of(sheet));
  sheet.sha256 = std::string(64, 'd');
  EXPECT_FALSE(verdict_of_entry(entry, sheet));
  EntryContent damaged = entry;
  damaged.details = "{\"limits\": [1, 2], \"findings\": []}";
  damaged.sheet_sha256 = sheet.sha256;
  EXPECT_FALSE(verdict_of_entry(damaged, sheet));
}

TEST(UnitEntry, HoldsOutsideTextOnlyEscaped) {
  PartSheet sheet = sheet_with_two_limits();
  UnitRun unit = a_unit(sheet);
  unit.verdict.serial = std::string("00\x1b[31m17\xff");
  InspectionSetting setting = setting_of(sheet);
  setting.lot = std::string("a\0b", 3);
  const EntryContent entry = unit_entry(unit, setting);
  ASSERT_TRUE(body_of(entry));
  EXPECT_EQ(entry.serial.find('\x1b'), std::string::npos);
}

TEST(LotEntry, TellsTheHistoryWhatItNeeds) {
  const PartSheet sheet = sheet_with_two_limits();
  LotOutcome lot;
  lot.plan.severity = Severity105::tightened;
  lot.decision.decision = LotResult::reject;
  lot.decision.between_accept_and_reject = true;
  lot.units = {3, 5, 8};
  const auto body = body_of(lot_entry(lot, setting_of(sheet)));
  ASSERT_TRUE(body);
  const auto content = content_of(*body);
  ASSERT_TRUE(content);
  const auto history = lot_history_of(*content);
  ASSERT_TRUE(history);
  EXPECT_EQ(history->severity, Severity105::tightened);
  EXPECT_EQ(history->decision, LotResult::reject);
  EXPECT_TRUE(history->between_accept_and_reject);
  EXPECT_THAT(units_of(*content), ElementsAre(3, 5, 8));
}

TEST(CheckEntry, ComesBackAsAReading) {
  PartSheet sheet = sheet_with_two_limits();
  sheet.check_standard = CheckStandard{};
  sheet.check_standard->serial = "CS-1";
  Estimate value;
  value.symbol = "L_s";
  value.quantity = henries(47.0200000000001e-6, 1e-9);
  const auto body = body_of(check_entry(value, {}, setting_of(sheet)));
  ASSERT_TRUE(body) << body.error().finding;
  const auto reading = check_reading_of(*content_of(*body));
  ASSERT_TRUE(reading);
  EXPECT_EQ(reading->value, 47.0200000000001e-6);
  EXPECT_EQ(reading->time, *parse_utc_time("2026-03-04T10:22:00Z"));
}

}  // namespace
}  // namespace coilassay::test

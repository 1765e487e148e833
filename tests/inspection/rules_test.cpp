// The four rules near a limit, and what is said with a verdict.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "base/random.h"
#include "inspection/verdict.h"
#include "tests/inspection/made_units.h"

namespace coilassay {
namespace {

using test::estimate;
using test::simple_sheet;
using test::tested;
using test::verdict_of;
using testing::HasSubstr;

// u = 1 uH, risk 5 %: the guard band is 1.645 uH. Rows: value, then simple, guarded_acceptance, guarded, guarded_rejection.
TEST(Rules, DifferWithinTheGuardBandAndAgreeOutsideIt) {
  using enum Verdict;
  struct Row {
    double value;
    Verdict simple, acceptance, guarded, rejection;
  };
  for (const Row& row : {Row{50e-6, pass, pass, pass, pass}, Row{41.7e-6, pass, pass, pass, pass},
                         Row{41.6e-6, pass, fail, undecided, pass}, Row{39.9e-6, fail, fail, undecided, pass},
                         Row{38.4e-6, fail, fail, undecided, pass}, Row{38.3e-6, fail, fail, fail, fail},
                         Row{58.4e-6, pass, fail, undecided, pass}, Row{61.7e-6, fail, fail, fail, fail}}) {
    EXPECT_EQ(verdict_of(simple_sheet("simple"), row.value, 1e-6), row.simple) << row.value;
    EXPECT_EQ(verdict_of(simple_sheet("guarded_acceptance"), row.value, 1e-6), row.acceptance) << row.value;
    EXPECT_EQ(verdict_of(simple_sheet("guarded"), row.value, 1e-6), row.guarded) << row.value;
    EXPECT_EQ(verdict_of(simple_sheet("guarded_rejection"), row.value, 1e-6), row.rejection) << row.value;
  }
}

TEST(Rules, AnotherRiskMakesAnotherGuardBand) {
  const PartSheet sheet = simple_sheet("guarded", "min = \"40 uH\"", "risk = \"2.275 %\"");
  EXPECT_EQ(verdict_of(sheet, 42.01e-6, 1e-6), Verdict::pass);   // 2 u
  EXPECT_EQ(verdict_of(sheet, 41.99e-6, 1e-6), Verdict::undecided);
}

// Guard of two limits 4 u and 5 u apart, from P(conforming) = 95 % by scipy (COMPUTED): 1.7962 u and 1.6488 u.
TEST(Rules, TwoLimitsCloseTogetherTakeTheirGuardFromTheProbabilityItself) {
  for (const auto& [apart, guard] : {std::pair{4.0, 1.7962127205961946}, {5.0, 1.6487665238787481}}) {
    const std::string limits = "min = \"40 uH\"\nmax = \"" + std::to_string(40 + apart) + " uH\"";
    const auto unit = judge_unit(simple_sheet("guarded", limits), "1", 1,
                                 std::vector{tested("ringdown", {estimate("L_s", (40 + guard * 1.001) * 1e-6, 1e-6)})});
    EXPECT_EQ(unit.verdict, Verdict::pass);
    EXPECT_NEAR(*unit.limits[0].guard, guard * 1e-6, 1e-12);
    EXPECT_EQ(verdict_of(simple_sheet("guarded", limits), (40 + guard * 0.999) * 1e-6, 1e-6), Verdict::undecided);
  }
}

TEST(Rules, AnIntervalWiderThanTheLimitsAllowLetsNothingPassAndSaysSo) {
  const PartSheet sheet = simple_sheet("guarded", "min = \"40 uH\"\nmax = \"43 uH\"");
  const auto unit = judge_unit(sheet, "1", 1, std::vector{tested("ringdown", {estimate("L_s", 41.5e-6, 1e-6)})});
  EXPECT_EQ(unit.verdict, Verdict::undecided);
  ASSERT_EQ(unit.findings.size(), 1u);
  EXPECT_EQ(unit.findings[0].code, "guard_band_too_wide");
  EXPECT_EQ(unit.findings[0].severity, Severity::caution);
  EXPECT_NEAR(unit.findings[0].figure, 3 / (2 * 1.959963984540054), 1e-9);
  EXPECT_NEAR(*unit.limits[0].capability, 3 / (2 * 1.959963984540054), 1e-9);
  // Far too wide: a value in the middle is not proof that the unit is bad.
  EXPECT_EQ(verdict_of(sheet, 41.5e-6, 50e-6), Verdict::undecided);
}

TEST(Rules, AModestCapabilityIsANoteAndAGoodOneIsSilent) {
  const PartSheet sheet = simple_sheet("guarded");
  const auto modest = judge_unit(sheet, "1", 1, std::vector{tested("ringdown", {estimate("L_s", 50e-6, 2e-6)})});
  ASSERT_EQ(modest.findings.size(), 1u);
  EXPECT_EQ(modest.findings[0].severity, Severity::note);
  const auto good = judge_unit(sheet, "1", 1, std::vector{tested("ringdown", {estimate("L_s", 50e-6, 1e-6)})});
  EXPECT_TRUE(good.findings.empty());
}

TEST(Rules, AValueWithoutUncertaintyDecidesOnlyUnderTheSimpleRule) {
  Estimate bare = estimate("L_s", 50e-6, 1e-6);
  bare.quantity.standard_uncertainty = bare.low = bare.high = std::nan("");
  const std::vector unit{tested("reading", {bare})};
  EXPECT_EQ(judge_unit(simple_sheet("simple"), "1", 1, unit).verdict, Verdict::pass);
  const auto guarded = judge_unit(simple_sheet("guarded"), "1", 1, unit);
  EXPECT_EQ(guarded.verdict, Verdict::undecided);
  EXPECT_THAT(guarded.limits[0].why, HasSubstr("accuracy"));
  EXPECT_FALSE(guarded.limits[0].p_conform);
}

TEST(Rules, TheGaugesDeviationWidensTheGuardBand) {
  const PartSheet sheet = simple_sheet("guarded", "min = \"40 uH\"", "[gauge]\nL_s = \"3 uH\"");
  const auto unit = judge_unit(sheet, "1", 1, std::vector{tested("ringdown", {estimate("L_s", 50e-6, 4e-6)})});
  EXPECT_NEAR(*unit.limits[0].u, 5e-6, 1e-12);
  EXPECT_NEAR(*unit.limits[0].guard, 5e-6 * 1.6448536269514722, 1e-11);
  EXPECT_NEAR(*unit.limits[0].u_own, 3e-6, 1e-12) << "no budget: only the gauge's part is known to be the unit's own";
}

Bound bound(std::optional<double> at_least, std::optional<double> at_most) {
  return {"L_s", Unit::henry, at_least, at_most, 0.95};
}

Verdict verdict_of_bound(const PartSheet& sheet, const Bound& known) {
  TestedUnit unit = tested("ringdown", {});
  unit.measurement.bounds.push_back(known);
  return judge_unit(sheet, "1", 1, std::vector{unit}).verdict;
}

TEST(Rules, ABoundDecidesOnlyWhereItLiesOnOneSide) {
  const PartSheet min = simple_sheet("guarded", "min = \"40 uH\""), both = simple_sheet("guarded");
  EXPECT_EQ(verdict_of_bound(min, bound(41e-6, std::nullopt)), Verdict::pass);
  EXPECT_EQ(verdict_of_bound(min, bound(39e-6, std::nullopt)), Verdict::undecided);
  EXPECT_EQ(verdict_of_bound(min, bound(std::nullopt, 39e-6)), Verdict::fail);
  EXPECT_EQ(verdict_of_bound(min, bound(std::nullopt, 41e-6)), Verdict::undecided);
  EXPECT_EQ(verdict_of_bound(both, bound(41e-6, std::nullopt)), Verdict::undecided);
  EXPECT_EQ(verdict_of_bound(both, bound(61e-6, std::nullopt)), Verdict::fail);
  EXPECT_EQ(verdict_of_bound(both, bound(41e-6, 59e-6)), Verdict::pass);
  // A bound of 95 % is not sure enough for a risk of 1 %.
  EXPECT_EQ(verdict_of_bound(simple_sheet("guarded", "min = \"40 uH\"", "risk = \"1 %\""), bound(41e-6, std::nullopt)), Verdict::undecided);
}

// 20 000 units that lie exactly on a limit: the share that passes is the risk, within four standard deviations of a
// binomial. Full size in proof_inspection_risk.
TEST(Rules, UnitsOnALimitPassAtTheStatedRisk) {
  constexpr int kUnits = 20000;
  const PartSheet sheet = simple_sheet("guarded", "min = \"40 uH\"\nmax = \"45 uH\"");
  Random random(11);
  int passed = 0;
  for (int i = 0; i < kUnits; ++i) passed += verdict_of(sheet, 45e-6 + 1e-6 * random.normal(), 1e-6) == Verdict::pass;
  // Two limits 5 u apart: 0.049195 by scipy (COMPUTED).
  EXPECT_NEAR(passed / static_cast<double>(kUnits), 0.04919547558984488, 4 * std::sqrt(0.049 * 0.951 / kUnits));
}

TEST(Rules, UnitsOnTheOnlyLimitPassAtTheStatedRisk) {
  constexpr int kUnits = 20000;
  const PartSheet sheet = simple_sheet("guarded", "min = \"40 uH\"");
  Random random(12);
  int passed = 0;
  for (int i = 0; i < kUnits; ++i) passed += verdict_of(sheet, 40e-6 + 1e-6 * random.normal(), 1e-6) == Verdict::pass;
  EXPECT_NEAR(passed / static_cast<double>(kUnits), 0.05, 4 * std::sqrt(0.05 * 0.95 / kUnits));
}

// Units from a process that is flat over the interval: of those whose printed probability lies between 60 and 70 % that
// share conforms, within four standard deviations of a binomial.
TEST(Rules, ThePrintedProbabilityOfConformingIsCalibrated) {
  const PartSheet sheet = simple_sheet("guarded", "min = \"40 uH\"\nmax = \"45 uH\"");
  Random random(13);
  double given = 0, conforming = 0, units = 0;
  for (int i = 0; i < 40000; ++i) {
    const double truth = random.uniform(34e-6, 51e-6), value = truth + 1e-6 * random.normal();
    const auto v = judge_unit(sheet, "1", 1, std::vector{tested("ringdown", {estimate("L_s", value, 1e-6)})}).limits[0];
    if (*v.p_conform < 0.6 || *v.p_conform > 0.7) continue;
    units += 1;
    given += *v.p_conform;
    conforming += truth >= 40e-6 && truth <= 45e-6;
  }
  ASSERT_GT(units, 500);
  EXPECT_NEAR(conforming / units, given / units, 4 * std::sqrt(0.65 * 0.35 / units));
}

}  // namespace
}  // namespace coilassay

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>

#include "inspection/sampling.h"
#include "tests/inspection/made_units.h"

namespace coilassay {
namespace {

using test::estimate;
using test::sheet_of;
using test::tested;
using testing::HasSubstr;

std::vector<UnitVerdict> units(std::initializer_list<std::pair<Verdict, int>> groups) {
  std::vector<UnitVerdict> all;
  for (const auto& [verdict, many] : groups) {
    for (int i = 0; i < many; ++i) all.push_back({std::to_string(all.size()), 1, verdict, {}, {}});
  }
  return all;
}

SamplingPlan plan_of(std::uint64_t n, std::uint64_t accept, std::uint64_t reject) {
  SamplingPlan plan;
  plan.scheme = SamplingScheme::attributes;
  plan.lot_size = 1000;
  plan.n = n;
  plan.accept = accept;
  plan.reject = reject;
  return plan;
}

TEST(Lot, IsAcceptedUpToAcAndRejectedFromRe) {
  const PartSheet sheet;
  using enum Verdict;
  EXPECT_EQ(decide_lot(sheet, plan_of(50, 1, 2), units({{pass, 49}, {fail, 1}})).decision, LotResult::accept);
  const LotDecision rejected = decide_lot(sheet, plan_of(50, 1, 2), units({{pass, 48}, {fail, 2}}));
  EXPECT_EQ(rejected.decision, LotResult::reject);
  EXPECT_EQ(rejected.counts.nonconforming, 2u);
  EXPECT_THAT(rejected.why, HasSubstr("2 of 50 nonconforming"));
}

TEST(Lot, BetweenAcAndReIsAcceptedAndBringsNormalInspectionBack) {
  using enum Verdict;
  const LotDecision lot = decide_lot({}, plan_of(20, 1, 4), units({{pass, 18}, {fail, 2}}));
  EXPECT_EQ(lot.decision, LotResult::accept);
  EXPECT_TRUE(lot.between_accept_and_reject);
}

TEST(Lot, WithFewerUnitsThanThePlanIsUndecided) {
  using enum Verdict;
  const LotDecision lot = decide_lot({}, plan_of(50, 1, 2), units({{pass, 49}}));
  EXPECT_EQ(lot.decision, LotResult::undecided);
  EXPECT_THAT(lot.why, HasSubstr("49 units inspected, and the plan asks for 50"));
}

TEST(Lot, UndecidedUnitsCountAsTheSheetSays) {
  using enum Verdict;
  PartSheet counted, aside;
  aside.sampling.undecided_set_aside = true;
  const auto two = units({{pass, 48}, {undecided, 1}, {not_comparable, 1}});
  EXPECT_EQ(decide_lot(counted, plan_of(50, 1, 2), two).decision, LotResult::reject);
  EXPECT_EQ(decide_lot(aside, plan_of(50, 1, 2), two).decision, LotResult::undecided);
  EXPECT_EQ(decide_lot(aside, plan_of(50, 2, 3), two).decision, LotResult::accept) << "even were both bad";
  EXPECT_EQ(decide_lot(aside, plan_of(50, 1, 2), units({{pass, 46}, {fail, 2}, {undecided, 2}})).decision, LotResult::reject);
}

PartSheet variables_sheet(const std::string& limits, const std::string& rule = "guarded") {
  return sheet_of("[part]\nname = \"p\"\n[[limit]]\nquantity = \"L_s\"\n" + limits + "[decision]\nrule = \"" + rule +
                  "\"\n[sampling]\nscheme = \"variables\"\nquantity = \"L_s\"\naql = 1.0\n");
}

/// Values with the same u; `own` is the part that is the unit's.
std::vector<UnitVerdict> measured(const PartSheet& sheet, const std::vector<double>& values, double u, double own) {
  std::vector<UnitVerdict> all;
  for (const double value : values) {
    TestedUnit unit = tested("ringdown", {estimate("L_s", value, u)});
    if (u > 0) {
      unit.measurement.budget["L_s"] = {{"fit", 'A', own, 0, false, ""}, {"capacitor", 'B', std::sqrt(u * u - own * own), 0, true, ""}};
    }
    all.push_back(judge_unit(sheet, std::to_string(all.size()), 1, std::vector{unit}));
  }
  return all;
}

SamplingPlan variables_plan_of(std::uint64_t n, double k) {
  SamplingPlan plan;
  plan.scheme = SamplingScheme::variables;
  plan.lot_size = 200;
  plan.n = n;
  plan.k = k;
  return plan;
}

// MIL-STD-414 example of form 1 (operating temperature, upper limit 209 degF; READ in no copy here, from memory, checked by
// computing): 197 188 184 205 201, mean 195, s 8.803, index 1.59 against k 1.53: accepted.
TEST(Lot, ByVariablesComparesTheIndexWithK) {
  const PartSheet sheet = variables_sheet("max = \"209 uH\"\n", "simple");
  const auto sample = measured(sheet, {197e-6, 188e-6, 184e-6, 205e-6, 201e-6}, 1e-9, 1e-9);
  const LotDecision lot = decide_lot(sheet, variables_plan_of(5, 1.53), sample);
  EXPECT_NEAR(*lot.mean, 195e-6, 1e-12);
  EXPECT_NEAR(*lot.deviation, 8.80340843e-6, 1e-12);
  EXPECT_NEAR(*lot.upper_index, 1.5903, 1e-4);
  EXPECT_EQ(lot.decision, LotResult::accept);
  EXPECT_EQ(decide_lot(sheet, variables_plan_of(5, 1.65), sample).decision, LotResult::reject);
}

// Both limits: with the mean in the middle each side takes half of M.
TEST(Lot, ByVariablesWithTwoLimitsAddsWhatLiesBeyondEach) {
  const PartSheet one = variables_sheet("max = \"209 uH\"\n", "simple"),
                  two = variables_sheet("min = \"181 uH\"\nmax = \"209 uH\"\n", "simple");
  const std::vector<double> values{197e-6, 188e-6, 184e-6, 205e-6, 201e-6};
  const LotDecision alone = decide_lot(one, variables_plan_of(5, 1.53), measured(one, values, 1e-9, 1e-9));
  const LotDecision both = decide_lot(two, variables_plan_of(5, 1.53), measured(two, values, 1e-9, 1e-9));
  EXPECT_EQ(alone.decision, LotResult::accept);
  EXPECT_EQ(both.decision, LotResult::reject);
  EXPECT_NEAR(*both.fraction_estimated, 2 * *alone.fraction_estimated, 1e-12);
}

TEST(Lot, WhatAllUnitsShareCanLeaveALotUndecided) {
  const PartSheet guarded = variables_sheet("max = \"209 uH\"\n");
  const std::vector<double> values{197e-6, 188e-6, 184e-6, 205e-6, 201e-6};
  // Index 1.59 against 1.53: 0.53 uH of the mean. A common error of 1 uH could turn it, one of 0.1 uH cannot.
  EXPECT_EQ(decide_lot(guarded, variables_plan_of(5, 1.53), measured(guarded, values, 1e-6, 0)).decision, LotResult::undecided);
  EXPECT_EQ(decide_lot(guarded, variables_plan_of(5, 1.53), measured(guarded, values, 0.1e-6, 0)).decision, LotResult::accept);
  // The same uncertainty as the units' own is in their deviation already.
  EXPECT_EQ(decide_lot(guarded, variables_plan_of(5, 1.53), measured(guarded, values, 1e-6, 1e-6)).decision, LotResult::accept);
}

TEST(Lot, ByVariablesNeedsAValueOfEveryUnit) {
  const PartSheet sheet = variables_sheet("max = \"209 uH\"\n");
  auto sample = measured(sheet, {197e-6, 188e-6, 184e-6, 205e-6, 201e-6}, 1e-9, 1e-9);
  sample[2].limits[0].value.reset();
  EXPECT_EQ(decide_lot(sheet, variables_plan_of(5, 1.53), sample).decision, LotResult::undecided);
}

}  // namespace
}  // namespace coilassay

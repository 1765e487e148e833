#include <gtest/gtest.h>

#include <cmath>

#include "inspection/verdict.h"
#include "tests/inspection/made_units.h"

namespace coilassay {
namespace {

using test::estimate;
using test::simple_sheet;
using test::tested;

UnitVerdict attempt(const PartSheet& sheet, std::uint64_t number, double value) {
  return judge_unit(sheet, "1", number, std::vector{tested("ringdown", {estimate("L_s", value, 0.1e-6)})});
}

UnitVerdict refused(const PartSheet& sheet, std::uint64_t number) {
  return judge_unit(sheet, "1", number, std::vector{tested("ringdown", {})});
}

PartSheet with_policy(const std::string& policy) { return simple_sheet("guarded", "min = \"40 uH\"\nmax = \"60 uH\"", "[retest]\n" + policy); }

TEST(Retest, TheFirstResultStandsWhateverCameLater) {
  const PartSheet sheet = with_policy("attempts = 2\nuse = \"first\"");
  const std::vector attempts{attempt(sheet, 1, 38e-6), attempt(sheet, 2, 50e-6)};
  const StandingVerdict standing = coilassay::standing(sheet, attempts);
  EXPECT_EQ(standing.verdict.verdict, Verdict::fail);
  EXPECT_EQ(standing.verdict.attempt, 1u);
  EXPECT_EQ(standing.counted, 2u);
  EXPECT_TRUE(standing.verdict.findings.empty());
}

TEST(Retest, AnAttemptThatMeasuredNothingIsNoResult) {
  const PartSheet sheet = with_policy("attempts = 1\nuse = \"first\"");
  const std::vector attempts{refused(sheet, 1), attempt(sheet, 2, 50e-6)};
  const StandingVerdict standing = coilassay::standing(sheet, attempts);
  EXPECT_EQ(standing.verdict.verdict, Verdict::pass);
  EXPECT_EQ(standing.counted, 1u);
  EXPECT_EQ(standing.made, 2u);
}

TEST(Retest, AttemptsBeyondThePolicyAreKeptAndDoNotCount) {
  const PartSheet sheet = with_policy("attempts = 2\nuse = \"mean\"");
  const std::vector attempts{attempt(sheet, 1, 38e-6), attempt(sheet, 2, 39e-6), attempt(sheet, 3, 60e-6)};
  const StandingVerdict standing = coilassay::standing(sheet, attempts);
  EXPECT_NEAR(*standing.verdict.limits[0].value, 38.5e-6, 1e-15);
  ASSERT_EQ(standing.verdict.findings.size(), 1u);
  EXPECT_EQ(standing.verdict.findings[0].code, "retest_limit");
  EXPECT_EQ(standing.verdict.findings[0].figure, 3);
}

TEST(Retest, TheMeanIsJudgedWithTheScatterOfTheAttempts) {
  const PartSheet sheet = with_policy("attempts = 3\nuse = \"mean\"");
  const std::vector attempts{attempt(sheet, 1, 39.9e-6), attempt(sheet, 2, 41.9e-6), attempt(sheet, 3, 40.9e-6)};
  const LimitVerdict v = coilassay::standing(sheet, attempts).verdict.limits[0];
  EXPECT_NEAR(*v.value, 40.9e-6, 1e-15);
  EXPECT_NEAR(*v.u, std::hypot(0.1e-6, 1e-6 / std::sqrt(3.0)), 1e-12);
  EXPECT_EQ(v.verdict, Verdict::undecided) << "t of two degrees of freedom makes the guard band wider than 0.9 uH";
}

// A part that passes 30 % of the time alone passes 66 % of the time by the best of three; by the first it stays at 30 %.
TEST(Retest, TryingUntilItPassesDoesNotHelp) {
  const PartSheet sheet = with_policy("attempts = 3\nuse = \"first\"");
  const std::vector attempts{attempt(sheet, 1, 40.0e-6), attempt(sheet, 2, 40.1e-6), attempt(sheet, 3, 40.4e-6)};
  EXPECT_EQ(attempts[2].verdict, Verdict::pass);
  EXPECT_EQ(coilassay::standing(sheet, attempts).verdict.verdict, Verdict::undecided);
}

}  // namespace
}  // namespace coilassay

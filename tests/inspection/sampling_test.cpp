#include "inspection/sampling.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <map>
#include <set>

#include "inspection/lot_statistics.h"
#include "tests/inspection/made_units.h"

namespace coilassay {
namespace {

using testing::HasSubstr;

Sampling attributes(const std::string& level = "II", double aql = 1.0) {
  Sampling sampling;
  sampling.scheme = SamplingScheme::attributes;
  sampling.level = level;
  sampling.aql_percent = aql;
  return sampling;
}

TEST(Sampling, ALotOf500AtLevelTwoIsLetterHWith50Units) {
  const auto plan = plan_for(attributes(), 500, Severity105::normal);
  ASSERT_TRUE(plan);
  EXPECT_EQ(plan->plan_letter, "H");
  EXPECT_EQ(plan->n, 50u);
  EXPECT_EQ(plan->accept, 1u);
  EXPECT_EQ(plan->reject, 2u);
  EXPECT_FALSE(plan->whole_lot);
  const auto arrow = plan_for(attributes("II", 0.65), 500, Severity105::normal);
  EXPECT_EQ(arrow->code_letter, "H");
  EXPECT_EQ(arrow->plan_letter, "J");
  EXPECT_EQ(arrow->n, 80u);
  EXPECT_THAT(plan->why, HasSubstr("code letter H"));
}

TEST(Sampling, APlanForMoreThanTheLotMeansAllOfIt) {
  const auto plan = plan_for(attributes("II", 0.10), 60, Severity105::normal);
  ASSERT_TRUE(plan);
  EXPECT_EQ(plan->n, 60u);
  EXPECT_TRUE(plan->whole_lot);
}

TEST(Sampling, IsRefusedWhereThereIsNoPlan) {
  EXPECT_FALSE(plan_for(attributes(), 0, Severity105::normal));
  EXPECT_THAT(plan_for(attributes(), 500, Severity105::discontinued).error().finding, HasSubstr("discontinued"));
  EXPECT_THAT(plan_for(attributes(), 500, Severity105::reduced).error().finding, HasSubstr("not allowed"));
  EXPECT_FALSE(plan_for(attributes("II", 0.7), 500, Severity105::normal));
  Sampling variables = attributes("II", 1.0);
  variables.scheme = SamplingScheme::variables;
  variables.quantity = "L_s";
  EXPECT_FALSE(plan_for(variables, 2, Severity105::normal)) << "three units of a lot of two";
}

// "8 units, none bad" accepts 66 % of lots that are 5 % bad: 0.95^8 = 0.6634, 0.9^8 = 0.4305.
TEST(Sampling, TheOperatingCharacteristicIsSaidInWords) {
  SamplingPlan plan;
  plan.scheme = SamplingScheme::attributes;
  plan.lot_size = 5000;
  plan.n = 8;
  EXPECT_EQ(passes_in_words(plan, 0.05), "a lot with 5 % bad passes 66 times in 100");
  EXPECT_EQ(passes_in_words(plan, 0.10), "a lot with 10 % bad passes 43 times in 100");
  EXPECT_EQ(passes_in_words(plan, 0.0), "a lot with 0 % bad always passes");
  EXPECT_EQ(passes_in_words(plan, 0.5), "a lot with 50 % bad passes less than once in 100");
  const auto curve = operating_characteristic(plan);
  EXPECT_EQ(curve.front().acceptance, 1);
  EXPECT_LT(curve.back().acceptance, 0.01);
}

// Hypergeometric and binomial sums by scipy 1.10 (COMPUTED).
TEST(Sampling, AFiniteLotIsCountedWithoutPuttingBack) {
  EXPECT_NEAR(hypergeometric_at_most(0, 8, 3, 50), 0.5857142857142856, 1e-12);
  EXPECT_NEAR(hypergeometric_at_most(1, 50, 25, 500), 0.2635939388471424, 1e-11);
  EXPECT_NEAR(binomial_at_most(1, 50, 0.05), 0.27943175232069517, 1e-12);
  SamplingPlan plan;
  plan.lot_size = 50;
  plan.n = 8;
  EXPECT_NEAR(acceptance_probability(plan, 0.06, true), 0.5857142857142856, 1e-12);
}

// 45 units for 90 %/95 % and 299 for 95 %/99 % (zero-acceptance sizes as commonly quoted, recomputed); finite lots by scipy's
// hypergeometric law (COMPUTED).
TEST(Sampling, AClaimTakesAsManyUnitsAsItNeeds) {
  EXPECT_EQ(claim_size(0.90, 0.95), 45u);
  EXPECT_EQ(claim_size(0.95, 0.99), 299u);
  EXPECT_EQ(claim_size_of_lot(0.90, 0.95, 100), 32u);
  EXPECT_EQ(claim_size_of_lot(0.90, 0.95, 50), 27u);
  EXPECT_EQ(claim_size_of_lot(0.95, 0.99, 200), 126u);
  EXPECT_EQ(claim_size_of_lot(0.90, 0.95, 1000), 44u);
  EXPECT_EQ(claim_size_of_lot(0.90, 0.95, 20), 14u);
  EXPECT_EQ(claim_size_of_lot(0.90, 0.95, 1), 1u);
}

TEST(Sampling, PositionsAreDrawnFromTheSeedAlone) {
  const auto drawn = draw_positions(500, 50, 7);
  EXPECT_EQ(drawn, draw_positions(500, 50, 7));
  EXPECT_NE(drawn, draw_positions(500, 50, 8));
  EXPECT_EQ(std::set<std::uint64_t>(drawn.begin(), drawn.end()).size(), 50u);
  EXPECT_GE(drawn.front(), 1u);
  EXPECT_LE(drawn.back(), 500u);
  EXPECT_EQ(draw_positions(5, 9, 1), (std::vector<std::uint64_t>{1, 2, 3, 4, 5}));
}

// 6 of 10, 20 000 times: every position 12 000 times, standard deviation 69; limits at 5 of them.
TEST(Sampling, EveryPositionIsDrawnEquallyOften) {
  std::map<std::uint64_t, int> seen;
  for (std::uint64_t seed = 1; seed <= 20000; ++seed) {
    for (const std::uint64_t position : draw_positions(10, 6, seed)) ++seen[position];
  }
  for (std::uint64_t position = 1; position <= 10; ++position) EXPECT_NEAR(seen[position], 12000, 5 * 69.3) << position;
}

TEST(Sampling, MoreUnitsThanThePlanAsksForAreDrawnFrom) {
  const auto plan = plan_for(attributes("II", 2.5), 20, Severity105::normal);
  ASSERT_TRUE(plan);
  EXPECT_EQ(plan->n, 5u);
  EXPECT_EQ(choose_sample(*plan, 20).size(), 5u);
  EXPECT_EQ(choose_sample(*plan, 5), (std::vector<std::size_t>{0, 1, 2, 3, 4}));
  EXPECT_EQ(choose_sample(*plan, 3).size(), 3u);
}

}  // namespace
}  // namespace coilassay

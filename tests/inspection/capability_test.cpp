#include "inspection/capability.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/random.h"

namespace coilassay {
namespace {

/// Eight values of mean 16 and standard deviation 2 exactly (Cp = 1 and Cpk = 2/3 for 8 to 20 in the handbook's example).
std::vector<double> of_mean_16_and_deviation_2() {
  const double d = 2 * std::sqrt(7.0 / 8.0);
  return {16 - d, 16 + d, 16 - d, 16 + d, 16 - d, 16 + d, 16 - d, 16 + d};
}

// NIST/SEMATECH e-Handbook of Statistical Methods, 6.1.6 (READ in three public notes, VERIFIED): USL 20, LSL 8, mean 16, s 2:
// Cp 1.0, Cpk 0.6667, Cpu 0.6667, Cpl 1.3333. The handbook's s is the overall deviation, which is Pp and Ppk here.
TEST(Capability, AgreesWithTheHandbooksExample) {
  const auto both = capability_of(of_mean_16_and_deviation_2(), 8, 20);
  ASSERT_TRUE(both);
  EXPECT_NEAR(both->mean, 16, 1e-12);
  EXPECT_NEAR(both->pp->value, 1.0, 1e-12);
  EXPECT_NEAR(both->ppk->value, 0.6667, 5e-5);
  const auto lower = capability_of(of_mean_16_and_deviation_2(), 8, std::nullopt);
  EXPECT_NEAR(lower->ppk->value, 1.3333, 5e-5);
  EXPECT_FALSE(lower->pp) << "one limit has no width";
}

TEST(Capability, IsNotSaidWithoutLimitsOrVariation) {
  EXPECT_FALSE(capability_of(std::vector<double>{1, 2}, 0, 3));
  EXPECT_FALSE(capability_of(std::vector<double>{1, 2, 3}, std::nullopt, std::nullopt));
  EXPECT_FALSE(capability_of(std::vector<double>{2, 2, 2}, 0, 3));
  EXPECT_TRUE(capability_of(std::vector<double>{1, std::nan(""), 2, 3}, 0, 3));
}

// A process that wanders: neighbours are close, the whole is wide, so Cp is larger than Pp.
TEST(Capability, ShortTermAndOverallDifferWhenTheProcessWanders) {
  std::vector<double> values;
  for (int i = 0; i < 50; ++i) values.push_back(i + (i % 2 == 0 ? 0.5 : -0.5));
  const auto c = capability_of(values, -10, 60);
  ASSERT_TRUE(c);
  EXPECT_GT(c->cp->value, 3 * c->pp->value);
}

// 4000 processes with known indices: the 95 % intervals hold them. Limits: four standard deviations of a binomial (1.4 %),
// and for the intervals of approximate laws 2 % more on the high side.
TEST(Capability, IntervalsCoverTheTruth) {
  constexpr int kProcesses = 4000;
  constexpr double kMin = -4, kMax = 5;   // sigma 1, mean 0: Cp = Pp = 1.5, Cpk = Ppk = 4/3
  int cp = 0, cpk = 0, pp = 0, ppk = 0;
  Random random(5);
  for (int i = 0; i < kProcesses; ++i) {
    std::vector<double> values(50);
    for (double& v : values) v = random.normal();
    const auto c = capability_of(values, kMin, kMax);
    const auto covers = [](const Index& index, double truth) { return index.low <= truth && truth <= index.high; };
    cp += covers(*c->cp, 1.5);
    cpk += covers(*c->cpk, 4.0 / 3);
    pp += covers(*c->pp, 1.5);
    ppk += covers(*c->ppk, 4.0 / 3);
  }
  for (const auto& [covered, words] : {std::pair{cp, "Cp"}, {cpk, "Cpk"}, {pp, "Pp"}, {ppk, "Ppk"}}) {
    EXPECT_GT(covered, 0.936 * kProcesses) << words;
    EXPECT_LT(covered, 0.970 * kProcesses) << words;
  }
}

TEST(IndividualsChart, MakesItsLimitsFromTheMovingRange) {
  // Ranges 2, 1, 3, 2: mean 2, sigma 2/1.128 = 1.7725, centre 10.4.
  const auto chart = individuals_chart(std::vector<double>{10, 12, 11, 8, 10});
  ASSERT_TRUE(chart);
  EXPECT_NEAR(chart->centre, 10.2, 1e-12);
  EXPECT_NEAR(chart->sigma, 1.7724538509, 1e-9);
  EXPECT_NEAR(chart->high, 10.2 + 3 * 1.7724538509, 1e-9);
  EXPECT_NEAR(chart->range_limit, 6.534, 1e-9);
  EXPECT_TRUE(chart->signals.empty());
  EXPECT_FALSE(individuals_chart(std::vector<double>{1, 2}));
}

std::vector<RunRule> rules_seen(const std::vector<double>& values) {
  std::vector<RunRule> rules;
  const auto chart = individuals_chart(values, 0.0, 1.0);
  for (const RunSignal& signal : chart->signals) rules.push_back(signal.rule);
  return rules;
}

TEST(IndividualsChart, RaisesEachRunRuleAloneAndNotOnePointEarlier) {
  using enum RunRule;
  EXPECT_EQ(rules_seen({0.1, 3.1, -0.1}), std::vector{beyond_3_sigma});
  EXPECT_EQ(rules_seen({0.1, 2.9, -0.1}), std::vector<RunRule>{});
  EXPECT_EQ(rules_seen({2.1, -0.1, 2.2}), std::vector{two_of_three});
  EXPECT_EQ(rules_seen({2.1, -0.1, 0.1, 2.2}), std::vector<RunRule>{});
  EXPECT_EQ(rules_seen({2.1, -0.1, -2.2}), std::vector<RunRule>{}) << "on two sides";
  EXPECT_EQ(rules_seen({-1.1, -1.2, -0.1, -1.3, -1.1}), std::vector{four_of_five});
  EXPECT_EQ(rules_seen({-1.1, -1.2, -0.1, -0.3, -1.1}), std::vector<RunRule>{});
  EXPECT_EQ(rules_seen({.1, .2, .1, .2, .1, .2, .1, .2}), std::vector{eight_on_one_side});
  EXPECT_EQ(rules_seen({.1, .2, .1, .2, .1, .2, .1, -.2}), std::vector<RunRule>{});
}

TEST(IndividualsChart, ARangeBeyondItsLimitIsNamed) {
  const auto chart = individuals_chart(std::vector<double>{0, 1, 0, 1, 0, 1, 0, 1, 0, 9, 10, 9});
  ASSERT_TRUE(chart);
  ASSERT_EQ(chart->ranges_out.size(), 1u);
  EXPECT_EQ(chart->ranges_out[0], 8u);
}

}  // namespace
}  // namespace coilassay

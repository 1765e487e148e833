#include "fitting/statistics.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <numbers>
#include <vector>

#include "base/random.h"

namespace coilassay {
namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr double kInfinity = std::numeric_limits<double>::infinity();

void expect_close(double value, double expected, double relative) {
  EXPECT_NEAR(value, expected, relative * std::abs(expected));
}

TEST(Statistics, QuantilesAgreeWithAnotherLibrary) {
  // SciPy 1.10 scipy.stats.norm.ppf, norm.cdf
  expect_close(normal_quantile(0.975), 1.959963984540054, 1e-14);
  expect_close(normal_quantile(0.95), 1.6448536269514722, 1e-14);
  expect_close(normal_quantile(1e-10), -6.361340902404056, 1e-13);
  EXPECT_EQ(normal_quantile(0.5), 0);
  expect_close(normal_cdf(-6), 9.865876450376946e-10, 1e-13);
  expect_close(normal_cdf(1), 0.8413447460685429, 1e-15);
  EXPECT_EQ(normal_cdf(0), 0.5);
  // SciPy 1.10 scipy.stats.t.ppf, which itself is good to 3e-10 only: see the closed forms below
  expect_close(student_t_quantile(0.975, 1), 12.706204736432095, 1e-9);
  expect_close(student_t_quantile(0.975, 2), 4.302652729911275, 1e-9);
  expect_close(student_t_quantile(0.975, 4.5), 2.6589123472044034, 1e-9);
  expect_close(student_t_quantile(0.95, 10), 1.8124611228107335, 1e-9);
  expect_close(student_t_quantile(0.995, 30), 2.7499956535670305, 1e-9);
  expect_close(student_t_quantile(0.975, 1e6), 1.9599663568141066, 1e-9);
  expect_close(student_t_quantile(0.025, 3), -3.1824463052842638, 1e-9);
  expect_close(student_t_quantile(0.975, 0.5), 164.55767352096103, 1e-9);
  // SciPy 1.10 scipy.stats.chi2.ppf
  expect_close(chi_square_quantile(0.95, 1), 3.841458820694124, 1e-12);
  expect_close(chi_square_quantile(0.05, 10), 3.9402991361190605, 1e-12);
  expect_close(chi_square_quantile(0.975, 100), 129.5611971858366, 1e-12);
  expect_close(chi_square_quantile(0.5, 2.5), 1.8738477677808791, 1e-12);
  expect_close(chi_square_quantile(1e-6, 3), 0.00024181048720124264, 1e-10);
  // SciPy 1.10 scipy.stats.f.sf; the last by chi2.sf(7.5, 3), for infinitely many degrees of freedom below
  expect_close(f_upper_tail(4, 3, 10), 0.04134768103608254, 1e-12);
  expect_close(f_upper_tail(1, 5, 5), 0.5, 1e-12);
  expect_close(f_upper_tail(200, 4, 8), 4.766843094909811e-08, 1e-10);
  expect_close(f_upper_tail(0.2, 3, 7), 0.89316795566249, 1e-12);
  expect_close(f_upper_tail(2.5, 3, kInfinity), 0.0575584519726364, 1e-6);
}

// One degree of freedom: tan(pi (p - 1/2)); two: (2p - 1) / sqrt(2p (1 - p)).
TEST(Statistics, StudentQuantilesAgreeWithTheClosedForms) {
  for (const double p : {0.6, 0.9, 0.975, 0.995}) {
    expect_close(student_t_quantile(p, 1), std::tan(std::numbers::pi * (p - 0.5)), 1e-12);
    expect_close(student_t_quantile(p, 2), (2 * p - 1) / std::sqrt(2 * p * (1 - p)), 1e-12);
  }
}

// Table G.2 of JCGM 100:2008 (t for 95 %), printed to two decimals; from memory.
TEST(Statistics, StudentQuantilesAgreeWithThePrintedTable) {
  const std::pair<double, double> table[] = {{1, 12.71}, {2, 4.30}, {3, 3.18},  {4, 2.78},  {5, 2.57},  {6, 2.45},
                                             {7, 2.36},  {8, 2.31}, {10, 2.23}, {15, 2.13}, {20, 2.09}, {50, 2.01}};
  for (const auto& [dof, t] : table) EXPECT_NEAR(student_t_quantile(0.975, dof), t, 0.0051) << dof;
}

TEST(Statistics, OutsideTheDomainIsNanAndTheEndsAreLimits) {
  for (const double bad : {-0.1, 1.1, kNan}) {
    EXPECT_TRUE(std::isnan(normal_quantile(bad)));
    EXPECT_TRUE(std::isnan(student_t_quantile(bad, 3)));
    EXPECT_TRUE(std::isnan(chi_square_quantile(bad, 3)));
  }
  for (const double bad : {0.0, -1.0, kNan}) {
    EXPECT_TRUE(std::isnan(student_t_quantile(0.9, bad)));
    EXPECT_TRUE(std::isnan(chi_square_quantile(0.9, bad)));
    EXPECT_TRUE(std::isnan(f_upper_tail(1, bad, 3)));
    EXPECT_TRUE(std::isnan(f_upper_tail(1, 3, bad)));
  }
  EXPECT_TRUE(std::isnan(f_upper_tail(kNan, 3, 3)));
  EXPECT_EQ(normal_quantile(0), -kInfinity);
  EXPECT_EQ(normal_quantile(1), kInfinity);
  EXPECT_EQ(student_t_quantile(1, 3), kInfinity);
  EXPECT_EQ(student_t_quantile(0, 3), -kInfinity);
  EXPECT_EQ(student_t_quantile(0.975, kInfinity), normal_quantile(0.975));
  EXPECT_EQ(chi_square_quantile(0, 3), 0);
  EXPECT_EQ(chi_square_quantile(1, 3), kInfinity);
  EXPECT_EQ(f_upper_tail(0, 3, 3), 1);
  EXPECT_EQ(f_upper_tail(kInfinity, 3, 3), 0);
  EXPECT_EQ(normal_cdf(-kInfinity), 0);
  EXPECT_EQ(normal_cdf(kInfinity), 1);
}

TEST(Statistics, SummaryLeavesMissingValuesOutAndCountsTheRest) {
  const std::vector<double> values = {2, kNan, 4, 4, 4, 5, 5, kNan, 7, 9};
  const Summary s = summarise(values);
  EXPECT_EQ(s.count, 8U);
  EXPECT_EQ(s.mean, 5);
  EXPECT_DOUBLE_EQ(s.standard_deviation, std::sqrt(32.0 / 7));
  EXPECT_EQ(s.min, 2);
  EXPECT_EQ(s.max, 9);
}

TEST(Statistics, SummaryKeepsASmallSpreadOnALargeOffset) {
  // As NIST StRD univariate NumAcc4 (from memory): 1e7 + 0.2, then alternating 1e7 + 0.1 and 1e7 + 0.3, 1001 values;
  // certified mean 10000000.2, standard deviation 0.1.
  std::vector<double> values = {10000000.2};
  for (int i = 0; i < 1000; ++i) values.push_back(i % 2 == 0 ? 10000000.1 : 10000000.3);
  const Summary s = summarise(values);
  EXPECT_NEAR(s.mean, 10000000.2, 1e-8);
  EXPECT_NEAR(s.standard_deviation, 0.1, 1e-8);
}

TEST(Statistics, OfNothingAreNotKnown) {
  const Summary none = summarise({});
  EXPECT_EQ(none.count, 0U);
  EXPECT_TRUE(std::isnan(none.mean));
  EXPECT_TRUE(std::isnan(none.standard_deviation));
  const std::vector<double> one = {3.0, kNan};
  EXPECT_EQ(summarise(one).mean, 3);
  EXPECT_TRUE(std::isnan(summarise(one).standard_deviation));
  EXPECT_TRUE(std::isnan(median({})));
  EXPECT_TRUE(std::isnan(robust_deviation({})));
  EXPECT_EQ(lag_one_correlation({}), 0);
  EXPECT_EQ(runs_test_z({}), 0);
}

TEST(Statistics, MedianOfOddEvenAndMissing) {
  EXPECT_EQ(median(std::vector<double>{5, 1, 3}), 3);
  EXPECT_EQ(median(std::vector<double>{5, 1, 3, 4}), 3.5);
  EXPECT_EQ(median(std::vector<double>{kNan, 2, kNan, 1}), 1.5);
}

TEST(Statistics, RobustDeviationIsThatOfTheNormalLawAndIgnoresOutliers) {
  Random random(3);
  std::vector<double> values(20'001);
  for (double& v : values) v = 7 + 2 * random.normal();
  // The median absolute deviation has 37 % of the efficiency: 2 * 1.17 / sqrt(N), times 4.5.
  EXPECT_NEAR(robust_deviation(values), 2, 4.5 * 2 * 1.17 / std::sqrt(20'001.0));
  for (std::size_t i = 0; i < 1000; ++i) values[i] = 1e9;
  EXPECT_NEAR(robust_deviation(values), 2, 0.2);
}

TEST(Statistics, LagOneCorrelationTellsWhiteFromSlowAndAlternating) {
  Random random(4);
  constexpr int kN = 10'000;
  std::vector<double> white(kN), slow(kN);
  double memory = 0;
  for (std::size_t i = 0; i < kN; ++i) {
    white[i] = random.normal();
    memory = 0.8 * memory + random.normal();
    slow[i] = memory;
  }
  EXPECT_LT(std::abs(lag_one_correlation(white)), 4.5 / std::sqrt(kN));
  EXPECT_NEAR(lag_one_correlation(slow), 0.8, 4.5 * std::sqrt((1 - 0.64) / kN));
  EXPECT_NEAR(lag_one_correlation(std::vector<double>{1, -1, 1, -1, 1, -1, 1, -1}), -1, 0.13);
  EXPECT_EQ(lag_one_correlation(std::vector<double>{2, 2, 2}), 0);
}

// Worked by hand: 8 positive and 7 negative signs in 5 runs; mean 1 + 112/15, variance 112 (112 - 15) / (225 * 14).
TEST(Statistics, RunsTestCountsRunsOfSigns) {
  const std::vector<double> signs = {1, 1, 1, 1, -1, -1, -1, kNan, 1, 1, 0, -1, -1, -1, -1, 1, 1};
  const double mean = 1 + 112.0 / 15;
  const double variance = 112.0 * 97 / (225 * 14);
  EXPECT_NEAR(runs_test_z(signs), (5 - mean) / std::sqrt(variance), 1e-12);
  EXPECT_GT(runs_test_z(std::vector<double>{1, -1, 1, -1, 1, -1, 1, -1, 1, -1}), 2);
  EXPECT_LT(runs_test_z(std::vector<double>(20, 1.0)), -4);   // one in 2^19 by chance
  EXPECT_LT(runs_test_z(std::vector<double>(5000, 1.0)), -30);
  EXPECT_TRUE(std::isfinite(runs_test_z(std::vector<double>(5000, 1.0))));
}

TEST(Statistics, RunsTestIsStandardNormalForWhiteResiduals) {
  Random random(5);
  std::vector<double> z(2000), white(300);
  for (double& value : z) {
    for (double& w : white) w = random.normal();
    value = runs_test_z(white);
  }
  const Summary s = summarise(z);
  EXPECT_NEAR(s.mean, 0, 4.5 / std::sqrt(2000.0));
  EXPECT_NEAR(s.standard_deviation, 1, 4.5 / std::sqrt(4000.0));
}

}  // namespace
}  // namespace coilassay

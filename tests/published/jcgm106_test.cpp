// Conformity: decision rules and worked numbers of JCGM 106:2012 and ISO 14253-1.
//
// Tags: READ in a public copy, MEMORY recalled; all VERIFIED by normal law or quadrature with scipy.
#include <gtest/gtest.h>

#include <cmath>

#include "fitting/statistics.h"
#include "inspection/global_risk.h"
#include "inspection/rules.h"
#include "inspection/value_law.h"

namespace coilassay {
namespace {

Verdict verdict(DecisionRule rule, double risk, double value, double u, std::optional<double> min, std::optional<double> max) {
  return apply_rule({rule, risk}, ValueLaw::normal(value, u), min, max).verdict;
}

double guard(double risk, double value, double u, std::optional<double> min, std::optional<double> max) {
  return apply_rule({DecisionRule::guarded_acceptance, risk}, ValueLaw::normal(value, u), min, max).guard;
}

// 7.3, Table 1 (MEMORY): z = (TU - y)/u for a wanted conformance probability.
TEST(Jcgm106, ConformanceProbabilityWithOneLimit) {
  for (const auto& [p, z] : {std::pair{0.80, 0.84}, {0.90, 1.28}, {0.95, 1.64}, {0.99, 2.33}, {0.999, 3.09}}) {
    EXPECT_NEAR(ValueLaw::normal(0, 1).inside(std::nullopt, z), p, 0.0015) << p;
  }
}

// 7.3 (MEMORY): breakdown voltage, TU -5.40, y -5.47, u 0.05: 0.92; burst pressure, TL 490, y 509.7, u 8.6: 0.99.
// 7.4 (MEMORY): viscosity, 12.5 to 16.3, y 13.6, u 1.8: 0.66.
TEST(Jcgm106, WorkedExamplesOfOneMeasurement) {
  EXPECT_NEAR(ValueLaw::normal(-5.47, 0.05).inside(std::nullopt, -5.40), 0.92, 0.005);
  EXPECT_NEAR(ValueLaw::normal(509.7, 8.6).inside(490.0, std::nullopt), 0.99, 0.005);
  EXPECT_NEAR(ValueLaw::normal(13.6, 1.8).inside(12.5, 16.3), 0.66, 0.005);
}

// 8.3.2 (READ): w = z(1 - risk) U/k; U 0.10, k 2: 0.10 for 2.3 %, 0.0823 for 5 %.
TEST(Jcgm106, GuardBandForARisk) {
  EXPECT_NEAR(guard(0.023, 0, 0.05, std::nullopt, 10), 0.10, 0.0003);
  EXPECT_NEAR(guard(0.05, 0, 0.05, std::nullopt, 10), 0.0823, 0.0001);
}

// 8.3.3 (MEMORY): speed, u 2 % of the value, limit 100, exceedance 99.9 %: 106.59 by solution, printed 107.
TEST(Jcgm106, GuardedRejectionOfASpeed) {
  double low = 100, high = 120;
  for (int i = 0; i < 60; ++i) {
    const double y = (low + high) / 2;
    (verdict(DecisionRule::guarded_rejection, 0.001, y, 0.02 * y, std::nullopt, 100) == Verdict::fail ? high : low) = y;
  }
  EXPECT_NEAR(high, 106.59, 0.005);
}

// ISO 14253-1:1998/2013 (READ): conformity is proven for TL + U <= y <= TU - U, nonconformity beyond U outside, U with k = 2.
TEST(Jcgm106, TheRuleOfIso14253) {
  constexpr double u = 0.5, risk = 0.022750131948179;   // z = 2
  for (const auto& [y, expected] : {std::pair{11.01, Verdict::pass}, {10.99, Verdict::undecided}, {9.01, Verdict::undecided},
                                    {8.99, Verdict::fail}, {18.99, Verdict::pass}, {19.01, Verdict::undecided}, {21.01, Verdict::fail}}) {
    EXPECT_EQ(verdict(DecisionRule::guarded, risk, y, u, 10, 20), expected) << y;
  }
}

// 9.5.4 (READ in a public notebook, VERIFIED by quadrature): gamma process of shape 4 and scale 0.25, TU 2, u_m 0.25:
// 4.24 % nonconforming, consumer's risk 0.0080 without guard band, 0.001 at acceptance limit 1.67 (w = 0.33). Producer's risks
// COMPUTED.
TEST(Jcgm106, GlobalRisksOfTheBallBearings) {
  const auto process = [](double x) { return x > 0 ? std::pow(x, 3) * std::exp(-x / 0.25) / (6 * std::pow(0.25, 4)) : 0; };
  const GlobalRisks bare = global_risks(process, 0, 8, 0.25, std::nullopt, 2.0, std::nullopt, 2.0);
  EXPECT_NEAR(bare.nonconforming, 0.0424, 5e-5);
  EXPECT_NEAR(bare.consumer, 0.0080, 5e-5);
  EXPECT_NEAR(bare.producer, 0.0174, 5e-5);
  double low = 1.5, high = 2;   // the acceptance limit that brings the consumer's risk to 0.001
  for (int i = 0; i < 50; ++i) {
    const double middle = (low + high) / 2;
    (global_risks(process, 0, 8, 0.25, std::nullopt, 2.0, std::nullopt, middle).consumer > 0.001 ? high : low) = middle;
  }
  EXPECT_NEAR(high, 1.67, 0.005);
  EXPECT_NEAR(global_risks(process, 0, 8, 0.25, std::nullopt, 2.0, std::nullopt, high).producer, 0.0755, 5e-5);
}

// CONSTRUCTED and COMPUTED: nominal 1500 +- 0.2, process sd 0.12, u_m 0.04, guard band w.
TEST(Jcgm106, GlobalRisksWithTwoLimits) {
  const auto process = [](double x) { return std::exp(-std::pow((x - 1500) / 0.12, 2) / 2) / (0.12 * std::sqrt(2 * M_PI)); };
  struct Row {
    double w, consumer, producer;
  };
  for (const Row& row : {Row{0, 0.0189422067, 0.0372078002}, Row{0.04, 0.0043340722, 0.1146565784}, Row{0.08, 0.0004686336, 0.2476696402},
                         Row{-0.08, 0.0694046100, 0.0006806010}}) {
    const GlobalRisks risks = global_risks(process, 1499, 1501, 0.04, 1499.8, 1500.2, 1499.8 + row.w, 1500.2 - row.w);
    EXPECT_NEAR(risks.consumer, row.consumer, 1e-8) << row.w;
    EXPECT_NEAR(risks.producer, row.producer, 1e-8) << row.w;
    EXPECT_NEAR(1 - risks.nonconforming, 0.9044192954, 1e-8);
  }
}

}  // namespace
}  // namespace coilassay

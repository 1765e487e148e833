#include "fitting/propagation.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <chrono>
#include <cmath>
#include <limits>
#include <vector>

#include "base/random.h"
#include "fitting/statistics.h"

namespace coilassay {
namespace {

using Kind = ErrorLaw::Kind;
using Terms = std::vector<ErrorLaw>;

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr double kInfinity = std::numeric_limits<double>::infinity();

ErrorLaw normal(double u) { return {Kind::normal, u, 0}; }
ErrorLaw rectangular(double u) { return {Kind::rectangular, u, 0}; }
ErrorLaw triangular(double u) { return {Kind::triangular, u, 0}; }
ErrorLaw student(double u, double dof) { return {Kind::student_t, u, dof}; }

TEST(CoverageFactor, OfASingleLawIsExact) {
  EXPECT_DOUBLE_EQ(coverage_factor(Terms{normal(2e-9)}), normal_quantile(0.975));
  EXPECT_DOUBLE_EQ(coverage_factor(Terms{rectangular(2e-9)}), 0.95 * std::sqrt(3.0));
  EXPECT_DOUBLE_EQ(coverage_factor(Terms{triangular(1)}), std::sqrt(6.0) * (1 - std::sqrt(0.05)));
  EXPECT_DOUBLE_EQ(coverage_factor(Terms{student(3, 4)}), student_t_quantile(0.975, 4));
  EXPECT_DOUBLE_EQ(coverage_factor(Terms{normal(3), normal(4), normal(0)}), normal_quantile(0.975));
  EXPECT_DOUBLE_EQ(coverage_factor(Terms{normal(1), rectangular(0)}, 0.99), normal_quantile(0.995));
}

TEST(CoverageFactor, OfNothingUncertainIsZeroAndOfTheUnknownNotKnown) {
  EXPECT_EQ(coverage_factor({}), 0);
  EXPECT_EQ(coverage_factor(Terms{normal(0), rectangular(0), student(0, 3)}), 0);
  for (const double bad : {kNan, -1.0, kInfinity}) EXPECT_TRUE(std::isnan(coverage_factor(Terms{normal(1), rectangular(bad)})));
  for (const double bad : {kNan, 0.0, -1.0}) EXPECT_TRUE(std::isnan(coverage_factor(Terms{normal(1), student(1, bad)})));
}

// Two rectangular errors of half-widths a >= b: the density is a trapezium, and beyond a - b the probability outside is
// (a + b - x)^2 / (4 a b).
TEST(CoverageFactor, OfTwoRectangularErrorsIsThatOfTheTrapezium) {
  for (const double ratio : {1.0, 0.9, 0.5, 0.3, 0.1, 0.03}) {
    for (const double confidence : {0.95, 0.99}) {
      const double a = std::sqrt(3.0), b = ratio * a;
      const double x = a + b - std::sqrt((1 - confidence) * 4 * a * b);
      if (x < a - b) continue;
      const double u = std::hypot(1, ratio);
      EXPECT_NEAR(coverage_factor(Terms{rectangular(1), rectangular(ratio)}, confidence), x / u, 2e-4) << ratio;
    }
  }
  EXPECT_NEAR(coverage_factor(Terms{rectangular(1), rectangular(1)}), 1.9018, 1e-4);
  // Flat to the quantile: inside a - b the smaller one does not matter at all.
  EXPECT_NEAR(coverage_factor(Terms{rectangular(1), rectangular(0.02)}) * std::hypot(1, 0.02), 0.95 * std::sqrt(3.0), 2e-4);
}

// JCGM 101:2008, 9.2.3, Table 3 and annex E: four equal rectangular errors, half-width 3.88 of u = 2 (read in a public
// test file); closed form 2 sqrt(3) (2 - (3/5)^(1/4)) = 3.8794 (computed).
TEST(CoverageFactor, OfFourRectangularErrorsIsThatOfTheSupplement) {
  const double k = coverage_factor(Terms(4, rectangular(1)));
  EXPECT_NEAR(2 * k, 3.88, 0.005);
  EXPECT_NEAR(2 * k, 2 * std::sqrt(3.0) * (2 - std::pow(0.6, 0.25)), 2e-4);
  // 9.2.4, Table 4: the fourth has standard deviation 10; half-width 17.0 of u = 10.1 (from memory, verified by trials).
  EXPECT_NEAR(std::sqrt(103.0) * coverage_factor(Terms{rectangular(1), rectangular(1), rectangular(1), rectangular(10)}),
              17.0, 0.05);
}

struct Mixture {
  ErrorLaw first, second;
  double k95, k99;
};

// Computed by integrating SciPy 1.10 scipy.stats.t.cdf and norm.cdf over the other law (quad) and solving (brentq).
TEST(CoverageFactor, OfMixturesAgreesWithNumericalIntegration) {
  const Mixture cases[] = {
      {student(1, 1), normal(1), 9.040293975053322, 45.02322146546863},
      {student(1, 1), rectangular(1), 9.03988223600265, 45.02321817652535},
      {student(0.2, 1), rectangular(1), 2.863855860574887, 12.56102111796511},
      {student(1, 2), normal(1), 3.2759533867055644, 7.123955851009647},
      {student(1, 2), rectangular(1), 3.2573240944693005, 7.121896256011621},
      {student(0.2, 2), rectangular(1), 1.8208231497871366, 2.572113861001187},
      {student(1, 4.5), normal(1), 2.312990199925828, 3.400569466330028},
      {student(1, 4.5), rectangular(1), 2.26757244112672, 3.3532064599398255},
      {student(0.2, 4.5), rectangular(1), 1.7198255867254209, 1.996434456234076},
      {student(1, 30), normal(1), 1.998235765053541, 2.6445181158225592},
      {student(1, 30), rectangular(1), 1.9546995004406995, 2.5235809366762236},
      {student(1, 120), normal(1), 1.969122114362306, 2.591809125921421},
      {student(1, 120), rectangular(1), 1.9263466130795892, 2.4616186869273156},
      {normal(1), rectangular(1), 1.91742354536611, 2.4425374053155324},
      {normal(0.3), rectangular(1), 1.7291766893122897, 1.9997923736737977},
      {normal(0.02), rectangular(1), 1.6451193076782265, 1.717100504277466},
  };
  for (const Mixture& c : cases) {
    for (const double unit : {1.0, 1e-12, 1e9}) {
      Terms terms = {c.first, c.second};
      for (ErrorLaw& term : terms) term.standard_uncertainty *= unit;
      EXPECT_NEAR(coverage_factor(terms), c.k95, 2e-4 * c.k95);
      EXPECT_NEAR(coverage_factor(terms, 0.99), c.k99, 2e-4 * c.k99);
    }
  }
}

// The sum of two Cauchy errors is a Cauchy error of twice the scale.
TEST(CoverageFactor, OfTwoErrorsOfOneDegreeOfFreedomKeepsTheTails) {
  EXPECT_NEAR(coverage_factor(Terms{student(1, 1), student(1, 1)}), std::sqrt(2.0) * 12.706204736432095, 1e-3);
}

// The handling changes from Bessel functions to an expansion and to the normal law: k must not jump there.
TEST(CoverageFactor, ChangesSmoothlyWithTheDegreesOfFreedom) {
  for (const double border : {1.0, 3.0, 5.0, 30.0, 1e4}) {
    const double below = coverage_factor(Terms{student(1, border * 0.9999), rectangular(0.5)});
    const double above = coverage_factor(Terms{student(1, border * 1.0001), rectangular(0.5)});
    EXPECT_NEAR(below / above, 1, border < 2 ? 1e-3 : 2e-4) << border;
  }
  const double many = coverage_factor(Terms{student(1, kInfinity), rectangular(1)});
  EXPECT_NEAR(many, coverage_factor(Terms{normal(1), rectangular(1)}), 1e-9);
}

// What a budget looks like: k must be that of the trials within three standard deviations of the trials' quantile.
TEST(CoverageFactor, OfWholeBudgetsAgreesWithTrials) {
  const Terms budgets[] = {
      {rectangular(1), rectangular(0.3), normal(0.2), student(0.4, 7)},
      {rectangular(1), rectangular(0.01), rectangular(0.012), normal(0.015), triangular(0.02), student(0.01, 40)},
      {triangular(1), rectangular(0.7), student(0.5, 3.3)},
      {student(1, 5), student(0.8, 9), normal(0.6), rectangular(0.4), rectangular(0.4)},
      Terms(12, rectangular(1)),
  };
  constexpr std::size_t kTrials = 400'000;
  std::uint64_t seed = 100;
  for (const Terms& terms : budgets) {
    Random random(seed++);
    double variance = 0;
    for (const ErrorLaw& term : terms) variance += term.standard_uncertainty * term.standard_uncertainty;
    const double k = coverage_factor(terms);
    std::size_t inside = 0;
    for (std::size_t i = 0; i < kTrials; ++i) {
      double sum = 0;
      for (const ErrorLaw& term : terms) {
        const double u = term.standard_uncertainty;
        switch (term.kind) {
          case Kind::normal: sum += u * random.normal(); break;
          case Kind::rectangular: sum += u * std::sqrt(3.0) * random.uniform(-1, 1); break;
          case Kind::triangular: sum += u * std::sqrt(6.0) * (random.uniform() + random.uniform() - 1); break;
          case Kind::student_t: sum += u * random.student_t(term.dof); break;
        }
      }
      inside += std::abs(sum) <= k * std::sqrt(variance) ? 1U : 0U;
    }
    EXPECT_NEAR(static_cast<double>(inside) / kTrials, 0.95, 3.5 * std::sqrt(0.95 * 0.05 / kTrials)) << seed;
  }
}

TEST(CoverageFactor, DoesNotDependOnTheOrderOfTheTerms) {
  Terms terms = {rectangular(1), normal(0.3), student(0.5, 4), triangular(0.2)};
  const double k = coverage_factor(terms);
  std::reverse(terms.begin(), terms.end());
  EXPECT_EQ(coverage_factor(terms), k);
}

TEST(CoverageFactor, StaysReasonableForAwkwardBudgets) {
  for (const double tiny : {1e-300, 1e-30, 1e-9, 1e-6}) {
    EXPECT_NEAR(coverage_factor(Terms{rectangular(1), normal(tiny)}), 0.95 * std::sqrt(3.0), 1e-4) << tiny;
    EXPECT_NEAR(coverage_factor(Terms{normal(1), student(tiny, 1)}), 1.96, 1e-3) << tiny;
    EXPECT_NEAR(coverage_factor(Terms{student(1, 4), rectangular(tiny)}), student_t_quantile(0.975, 4), 1e-3) << tiny;
    EXPECT_NEAR(coverage_factor(Terms{rectangular(1), student(tiny, 2.3)}), 0.95 * std::sqrt(3.0), 2e-3) << tiny;
  }
  EXPECT_NEAR(coverage_factor(Terms{rectangular(1e-300), normal(1e-300)}), 1.91742354536611, 4e-4);
  EXPECT_NEAR(coverage_factor(Terms(60, rectangular(1))), 1.96, 3e-3);
}

// JCGM 100:2008, H.1.6: 16.7 from six terms (read in a public manual of a statistics package); the terms are printed to
// two digits, and from those it is 16.75 (computed).
TEST(EffectiveDof, IsThatOfTheEndGaugeExample) {
  const Terms terms = {student(25.0, 18), student(5.8, 24), student(3.9, 5), student(6.7, 8), student(2.9, 50), student(16.6, 2)};
  EXPECT_NEAR(effective_dof(terms), 16.7, 0.06);
  EXPECT_TRUE(std::isinf(effective_dof(Terms{normal(1), rectangular(2)})));
  EXPECT_TRUE(std::isinf(effective_dof({})));
  EXPECT_DOUBLE_EQ(effective_dof(Terms{student(1e-200, 3), student(1e-200, 3)}), 6);
  EXPECT_TRUE(std::isnan(effective_dof(Terms{normal(kNan)})));
}

}  // namespace
}  // namespace coilassay

#include "fitting/joint_fit.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/random.h"
#include "fitting/bounded_interval.h"

namespace coilassay {
namespace {

/// Observations of a, b and their product, each with u = 0.01.
JointProblem product_problem(const std::vector<double>& seen) {
  JointProblem problem;
  problem.residual_count = seen.size();
  problem.scale = {1, 1};
  problem.residuals = [seen](std::span<const double> p, std::span<double> r) {
    const double predicted[] = {p[0], p[1], p[0] * p[1]};
    for (std::size_t i = 0; i < r.size(); ++i) r[i] = (seen[i] - predicted[i]) / 0.01;
    return true;
  };
  return problem;
}

TEST(JointFit, WeighsRedundantObservationsAsTheNormalEquationsDo) {
  const JointFit fit = fit_jointly(product_problem({2.0, 3.0, 6.0}), std::vector<double>{1.0, 1.0});
  ASSERT_TRUE(fit.converged);
  EXPECT_NEAR(fit.parameters[0], 2, 1e-8);
  EXPECT_NEAR(fit.parameters[1], 3, 1e-8);
  // By hand: J'J = [1 + 9, 6; 6, 1 + 4], its inverse times 1e-4.
  const double det = 10 * 5 - 36;
  EXPECT_NEAR(fit.covariance(0, 0), 1e-4 * 5 / det, 1e-9);
  EXPECT_NEAR(fit.covariance(1, 1), 1e-4 * 10 / det, 1e-9);
  EXPECT_NEAR(fit.covariance(0, 1), -1e-4 * 6 / det, 1e-9);
  // The gain carries an error of the third observation by the same numbers.
  const JointFit moved = fit_jointly(product_problem({2.0, 3.0, 6.001}), std::vector<double>{2.0, 3.0});
  EXPECT_NEAR(moved.parameters[0] - 2, 0.1 * fit.gain(0, 2), 1e-6);
  EXPECT_NEAR(moved.parameters[1] - 3, 0.1 * fit.gain(1, 2), 1e-6);
}

TEST(JointFit, LeavesOpenWhatNothingTouches) {
  JointProblem problem;
  problem.residual_count = 1;
  problem.scale = {1, 1};
  problem.residuals = [](std::span<const double> p, std::span<double> r) {
    r[0] = (5 - p[0] - p[1]) / 0.1;
    return true;
  };
  const JointFit fit = fit_jointly(problem, std::vector<double>{1.0, 1.0});
  EXPECT_EQ(fit.rank, 1u);
  ASSERT_EQ(fit.open.cols(), 1);
  EXPECT_TRUE(determined(fit, problem.scale, Eigen::Vector2d(1, 1)));    // the sum is known
  EXPECT_FALSE(determined(fit, problem.scale, Eigen::Vector2d(1, 0)));   // the parts are not
  const Eigen::Vector2d sum(1, 1);
  EXPECT_NEAR(sum.dot(fit.covariance * sum), 0.01, 1e-6);
}

TEST(JointFit, ChiSquareOverAHeldParameterIsThatOfTheOthersRefitted) {
  const JointProblem problem = product_problem({2.0, 3.0, 6.0});
  const JointFit fit = fit_jointly(problem, std::vector<double>{2.0, 3.0});
  const double u = std::sqrt(fit.covariance(0, 0));
  EXPECT_NEAR(profile_chi_square(problem, fit, 0, 2 + u), 1, 0.02);
  EXPECT_NEAR(profile_chi_square(problem, fit, 0, 2 - 2 * u), 4, 0.08);
}

TEST(JointFit, APromisedDropIsWhatTheFitThenGains) {
  JointProblem problem = product_problem({2.0, 3.0, 6.1});
  problem.fixed = {true, false};
  const JointFit held = fit_jointly(problem, std::vector<double>{2.0, 3.0});
  problem.fixed = {false, false};
  const std::vector<double> at(held.parameters.data(), held.parameters.data() + 2);
  const double promised = promised_drop(problem, at);
  const JointFit freed = fit_jointly(problem, at);
  EXPECT_NEAR(promised, held.chi_square - freed.chi_square, 0.05 * promised);
}

// The unified interval covers 95 % at every distance: drawn here, not taken from the formula that sets the factor.
TEST(BoundedInterval, CoversAtEveryDistanceFromItsBoundary) {
  for (const double truth : {0.0, 0.1, 0.5, 1.0, 1.5, 2.0, 4.0}) {
    Random random(11);
    int covered = 0;
    constexpr int kTrials = 4000;
    for (int i = 0; i < kTrials; ++i) {
      const double seen = truth + random.normal();
      BoundedRequest request{.best = seen, .u = 1, .low = 0, .high = 1e9};
      const BoundedInterval interval =
          bounded_interval(request, [seen](double x) { return (x - seen) * (x - seen); });
      covered += interval.low <= truth && truth <= interval.high ? 1 : 0;
      ASSERT_GE(interval.high, interval.low);
    }
    // Three standard deviations of 4000 trials are 1 %.
    EXPECT_NEAR(static_cast<double>(covered) / kTrials, 0.95, 0.011) << truth;
  }
}

TEST(BoundedInterval, BecomesOneSidedByItselfAndStaysOrdinaryFarAway) {
  const auto at = [](double seen) {
    BoundedRequest request{.best = seen, .u = 0.1, .low = 0, .high = 1};
    return bounded_interval(request, [seen](double x) { return (x - seen) * (x - seen) / 0.01; });
  };
  const BoundedInterval middle = at(0.5);
  EXPECT_NEAR(middle.low, 0.5 - 0.196, 1e-3);
  EXPECT_NEAR(middle.high, 0.5 + 0.196, 1e-3);
  const BoundedInterval near = at(0.1);
  EXPECT_TRUE(near.at_low);
  EXPECT_NEAR(near.high, 0.1 + 0.196, 1e-3);
  const BoundedInterval beyond = at(-0.3);
  EXPECT_TRUE(beyond.at_low);
  EXPECT_EQ(beyond.best, 0);
  EXPECT_GT(beyond.high, 0.01);   // not empty
  EXPECT_TRUE(at(1.05).at_high);
}

}  // namespace
}  // namespace coilassay

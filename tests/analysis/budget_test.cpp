#include "analysis/budget.h"

#include <gtest/gtest.h>

#include <cmath>

namespace coilassay {
namespace {

InputError rectangular(const char* source, double value, double half_width) {
  InputError input;
  input.source = source;
  input.value = value;
  input.law = {ErrorLaw::Kind::rectangular, half_width / std::sqrt(3.0), 0};
  return input;
}

void inductance(std::span<const double> x, std::span<double> y) { y[0] = 1 / (x[0] * x[0] * x[1]); }

// L = 1/(w^2 C): one rectangular term rules, so k is 0.95 sqrt(3) = 1.645.
TEST(Budget, OneRectangularTermGivesItsOwnCoverageFactor) {
  Measurement result;
  add_estimates(result, {rectangular("frequency", 1e6, 1), rectangular("capacitor", 1e-8, 1e-10)}, {}, {{"L_s"}}, inductance,
                {}, {});
  const Estimate* l = result.find("L_s");
  ASSERT_NE(l, nullptr);
  EXPECT_NEAR(l->quantity.value, 1e-4, 1e-12);
  EXPECT_NEAR(l->quantity.standard_uncertainty, 1e-6 / std::sqrt(3.0), 1e-10);  // to first order
  EXPECT_NEAR(l->k, 0.95 * std::sqrt(3.0), 2e-3);
  EXPECT_NEAR(l->low, 1e-4 - 0.95e-6, 2e-9);
  ASSERT_EQ(result.budget["L_s"].size(), 2U);
  EXPECT_EQ(result.budget["L_s"][0].source, "capacitor");
  EXPECT_GT(result.budget["L_s"][0].share, 0.999);
}

TEST(Budget, FittedParametersCarryTheirCorrelation) {
  FittedInputs fitted;
  fitted.values = Eigen::Vector2d(3, 2);
  fitted.covariance.resize(2, 2);
  fitted.covariance << 0.04, 0.03, 0.03, 0.09;
  Measurement result;
  const auto f = [](std::span<const double> x, std::span<double> y) {
    y[0] = x[0] - x[1];
    y[1] = x[0] + x[1];
  };
  add_estimates(result, {}, fitted, {{"L_1"}, {"L_2"}}, f, {}, {});
  EXPECT_NEAR(result.find("L_1")->quantity.standard_uncertainty, std::sqrt(0.04 + 0.09 - 0.06), 1e-12);
  EXPECT_NEAR(result.find("L_2")->quantity.standard_uncertainty, std::sqrt(0.04 + 0.09 + 0.06), 1e-12);
  ASSERT_EQ(result.correlations.size(), 1U);
  EXPECT_NEAR(result.correlations[0].value, (0.04 - 0.09) / std::sqrt(0.07 * 0.19), 1e-9);
  EXPECT_NEAR(result.find("L_1")->k, 1.95996, 1e-3);
}

// 1/Q is what the errors act on: Q's interval is the image of that of 1/Q.
TEST(Budget, ReciprocalIntervalIsTheImageOfTheInverse) {
  FittedInputs fitted;
  fitted.values = Eigen::VectorXd::Constant(1, 0.02);
  fitted.covariance = Eigen::MatrixXd::Constant(1, 1, 0.006 * 0.006);
  Measurement result;
  const auto f = [](std::span<const double> x, std::span<double> y) { y[0] = x[0]; };
  add_estimates(result, {}, fitted, {{"Q", true}}, f, {}, {});
  const Estimate* q = result.find("Q");
  ASSERT_NE(q, nullptr);
  EXPECT_NEAR(q->quantity.value, 50, 1e-9);
  EXPECT_NEAR(q->low, 1 / (0.02 + 1.95996 * 0.006), 0.02);
  EXPECT_NEAR(q->high, 1 / (0.02 - 1.95996 * 0.006), 0.1);
  EXPECT_NEAR(q->k * q->quantity.standard_uncertainty, q->half_width(), 1e-9);
}

TEST(Budget, AnOpenReciprocalIntervalBecomesABound) {
  FittedInputs fitted;
  fitted.values = Eigen::VectorXd::Constant(1, 0.005);
  fitted.covariance = Eigen::MatrixXd::Constant(1, 1, 0.006 * 0.006);
  Measurement result;
  const auto f = [](std::span<const double> x, std::span<double> y) { y[0] = x[0]; };
  add_estimates(result, {}, fitted, {{"Q", true}}, f, {}, {});
  EXPECT_EQ(result.find("Q"), nullptr);
  ASSERT_EQ(result.bounds.size(), 1U);
  EXPECT_NEAR(*result.bounds[0].at_least, 1 / (0.005 + 1.95996 * 0.006), 0.1);
  EXPECT_FALSE(result.bounds[0].at_most.has_value());
}

TEST(Budget, TrialsAgreeWithFirstOrderWhereTheFunctionIsNearlyStraight) {
  const std::vector<InputError> inputs{rectangular("frequency", 1e6, 2e3), rectangular("capacitor", 1e-8, 1e-10)};
  Measurement first, trials;
  add_estimates(first, inputs, {}, {{"L_s"}}, inductance, {}, {});
  PropagationOptions options;
  options.by_trials = true;
  add_estimates(trials, inputs, {}, {{"L_s"}}, inductance, {}, options);
  EXPECT_NEAR(trials.find("L_s")->quantity.standard_uncertainty, first.find("L_s")->quantity.standard_uncertainty, 5e-9);
  EXPECT_NEAR(trials.find("L_s")->low, first.find("L_s")->low, 2e-8);
  EXPECT_FALSE(first.has_finding("propagation_disagrees"));
}

TEST(Budget, SaysWhenTheFunctionBendsWithinItsErrors) {
  Measurement result;
  const auto f = [](std::span<const double> x, std::span<double> y) { y[0] = x[0] * x[0]; };
  add_estimates(result, {rectangular("a", 1, 0.9)}, {}, {{"L_s"}}, f, {}, {});
  EXPECT_TRUE(result.has_finding("propagation_disagrees"));
}

TEST(Budget, ExactBenchSwitchesDefaultsOffButKeepsWhatIsStated) {
  PropagationOptions exact;
  exact.exact_bench = true;
  const DefaultTolerance otherwise{0.5, "±50 %"};
  EXPECT_GT(input_error("x", StatedValue::unstated(1, Unit::ohm), otherwise, {}).law.standard_uncertainty, 0.28);
  EXPECT_EQ(input_error("x", StatedValue::unstated(1, Unit::ohm), otherwise, exact).law.standard_uncertainty, 0);
  EXPECT_GT(input_error("x", StatedValue::rectangular(1, 0.1, Unit::ohm), otherwise, exact).law.standard_uncertainty, 0);
  EXPECT_EQ(input_error("x", StatedValue::exact(1, Unit::ohm), otherwise, {}).law.standard_uncertainty, 0);
}

}  // namespace
}  // namespace coilassay

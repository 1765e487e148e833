#include "fitting/straight_line.h"

#include <gtest/gtest.h>

#include <array>
#include <vector>

#include "base/random.h"

namespace coilassay {
namespace {

TEST(StraightLine, ThroughExactPointsIsExactWithoutScatter) {
  const std::array x{1.0, 2.0, 4.0};
  const std::array y{3.0, 5.0, 9.0};
  const StraightLine line = fit_straight_line(x, y);
  EXPECT_DOUBLE_EQ(line.slope, 2);
  EXPECT_NEAR(line.intercept, 1, 1e-15);
  EXPECT_NEAR(line.u_slope, 0, 1e-15);
}

TEST(StraightLine, WithoutTwoDifferentXThereIsNone) {
  const std::array x{2.0, 2.0, 2.0};
  const std::array y{1.0, 2.0, 3.0};
  EXPECT_TRUE(std::isnan(fit_straight_line(x, y).slope));
  EXPECT_TRUE(std::isnan(fit_straight_line({}, {}).slope));
}

TEST(StraightLine, OfTwoPointsKnowsNoUncertainty) {
  const std::array x{0.0, 2.0};
  const std::array y{1.0, 2.0};
  const StraightLine line = fit_straight_line(x, y);
  EXPECT_DOUBLE_EQ(line.slope, 0.5);
  EXPECT_TRUE(std::isnan(line.u_slope));
}

// A point of weight 4 counts like four of weight 1.
TEST(StraightLine, WeightsCountAsRepeatedPoints) {
  const std::array x{0.0, 1.0, 2.0, 3.0};
  const std::array y{0.1, 0.9, 2.3, 2.8};
  const std::array w{1.0, 4.0, 1.0, 1.0};
  const std::array x7{0.0, 1.0, 1.0, 1.0, 1.0, 2.0, 3.0};
  const std::array y7{0.1, 0.9, 0.9, 0.9, 0.9, 2.3, 2.8};
  EXPECT_NEAR(fit_straight_line(x, y, w).slope, fit_straight_line(x7, y7).slope, 1e-14);
  EXPECT_NEAR(fit_straight_line(x, y, w).intercept, fit_straight_line(x7, y7).intercept, 1e-14);
}

TEST(Instruments, ThatAreTheRegressorsGiveLeastSquares) {
  Random random(3);
  const Eigen::Index n = 40;
  Eigen::MatrixXd x(n, 2);
  Eigen::VectorXd y(n);
  std::vector<double> xs, ys;
  for (Eigen::Index i = 0; i < n; ++i) {
    xs.push_back(1e-3 * static_cast<double>(i));
    ys.push_back(5 + 2e3 * xs.back() + random.normal());
    x.row(i) << 1, xs.back();
    y[i] = ys.back();
  }
  const LinearFit fit = fit_by_instruments(x, x, y, Eigen::VectorXd::Ones(n));
  const StraightLine line = fit_straight_line(xs, ys);
  ASSERT_TRUE(fit.usable());
  EXPECT_NEAR(fit.parameters[1], line.slope, 1e-9 * line.slope);
  EXPECT_NEAR(fit.standard_uncertainty(1, fit.residual_deviation), line.u_slope, 1e-9 * line.u_slope);
  EXPECT_NEAR(fit.standard_uncertainty(0, fit.residual_deviation), line.u_intercept, 1e-9 * line.u_intercept);
}

// Noise of 0.2 on an x of -1 or 1: least squares loses the share 0.04/1.04 of the slope, the groups lose nothing.
TEST(Instruments, OfGroupsAreNotPulledDownByNoiseOfX) {
  const Eigen::Index n = 20000;
  Random random(11);
  Eigen::MatrixXd x(n, 2), z(n, 2);
  Eigen::VectorXd y(n);
  std::vector<double> xs, ys;
  for (Eigen::Index i = 0; i < n; ++i) {
    const double side = i % 2 == 0 ? 1 : -1;
    xs.push_back(side + 0.2 * random.normal());
    ys.push_back(3 * side);
    x.row(i) << 1, xs.back();
    z.row(i) << 1, side;
    y[i] = ys.back();
  }
  const LinearFit fit = fit_by_instruments(x, z, y, Eigen::VectorXd::Ones(n));
  ASSERT_TRUE(fit.usable());
  const double u = fit.standard_uncertainty(1, fit.residual_deviation);
  EXPECT_NEAR(fit.parameters[1], 3, 3 * u);
  EXPECT_LT(u, 0.006);
  EXPECT_NEAR(fit_straight_line(xs, ys).slope, 3 / 1.04, 0.01);
}

TEST(Instruments, ThatDoNotTellThePointsApartGiveNoFit) {
  const Eigen::Index n = 5;
  Eigen::MatrixXd x(n, 2);
  x.col(0).setOnes();
  x.col(1).setConstant(2);
  EXPECT_FALSE(fit_by_instruments(x, x, Eigen::VectorXd::Ones(n), Eigen::VectorXd::Ones(n)).usable());
  x.col(1).setZero();
  EXPECT_FALSE(fit_by_instruments(x, x, Eigen::VectorXd::Ones(n), Eigen::VectorXd::Ones(n)).usable());
}

}  // namespace
}  // namespace coilassay

#include "fitting/least_squares.h"

#include <gtest/gtest.h>

#include <cmath>
#include <vector>

#include "base/random.h"

namespace coilassay {
namespace {

struct Line {
  std::vector<double> x, y;
  template <class T>
  bool operator()(const T* p, T* residuals) const {
    for (std::size_t i = 0; i < x.size(); ++i) residuals[i] = p[0] + p[1] * x[i] - y[i];
    return true;
  }
};

Line straight_line(std::size_t n, double sigma, std::uint64_t seed) {
  Random random(seed);
  Line line;
  for (std::size_t i = 0; i < n; ++i) {
    line.x.push_back(static_cast<double>(i));
    line.y.push_back(2 + 0.5 * line.x.back() + sigma * random.normal());
  }
  return line;
}

// A straight line has a solution on paper: compare with the textbook sums.
TEST(LeastSquares, AgreesWithTheClosedFormOfAStraightLine) {
  const Line line = straight_line(50, 0.1, 3);
  const auto fit = fit_least_squares<2>(line, 50, std::vector<double>{0, 0});
  ASSERT_TRUE(fit) << fit.error().finding;
  ASSERT_TRUE(fit->usable());
  double sx = 0, sy = 0, sxx = 0, sxy = 0;
  for (std::size_t i = 0; i < 50; ++i) {
    sx += line.x[i];
    sy += line.y[i];
    sxx += line.x[i] * line.x[i];
    sxy += line.x[i] * line.y[i];
  }
  const double determinant = 50 * sxx - sx * sx;
  const double slope = (50 * sxy - sx * sy) / determinant, intercept = (sy - slope * sx) / 50;
  EXPECT_NEAR(fit->parameters[0], intercept, 1e-12);
  EXPECT_NEAR(fit->parameters[1], slope, 1e-13);
  double squares = 0;
  for (std::size_t i = 0; i < 50; ++i) squares += std::pow(line.y[i] - intercept - slope * line.x[i], 2);
  EXPECT_NEAR(fit->reduced_chi_square, squares / 48, 1e-12);
  EXPECT_NEAR(fit->residual_rms, std::sqrt(squares / 50), 1e-12);
  EXPECT_NEAR(fit->standard_uncertainty(1), std::sqrt(squares / 48 * 50 / determinant), 1e-12);
  EXPECT_NEAR(fit->correlation(0, 1), -sx / std::sqrt(50 * sxx), 1e-9);
}

TEST(LeastSquares, TakesTheCovarianceAsItIsWhenSigmaIsKnown) {
  const Line line = straight_line(50, 0.1, 3);
  const auto scaled = fit_least_squares<2>(line, 50, std::vector<double>{0, 0});
  const auto known = fit_least_squares<2>(line, 50, std::vector<double>{0, 0}, {.known_sigma = true});
  ASSERT_TRUE(scaled && known);
  EXPECT_NEAR(known->standard_uncertainty(0) * std::sqrt(scaled->reduced_chi_square), scaled->standard_uncertainty(0),
              1e-9);
}

TEST(LeastSquares, SaysSoWhenAParameterSitsOnItsBound) {
  const Line line = straight_line(50, 0.1, 3);
  LeastSquaresOptions options;
  options.lower = {-10, 0.6};  // the slope is 0.5
  options.upper = {10, 2};
  const auto fit = fit_least_squares<2>(line, 50, std::vector<double>{0, 1}, options);
  ASSERT_TRUE(fit);
  EXPECT_DOUBLE_EQ(fit->parameters[1], 0.6);
  EXPECT_FALSE(fit->at_bound[0]);
  EXPECT_TRUE(fit->at_bound[1]);
  EXPECT_FALSE(fit->usable());
}

TEST(LeastSquares, StartsInsideTheBoundsWhenTheGivenStartIsOutside) {
  const Line line = straight_line(50, 0.1, 3);
  LeastSquaresOptions options;
  options.lower = {0, 0};
  options.upper = {10, 2};
  const auto fit = fit_least_squares<2>(line, 50, std::vector<double>{-5, 7}, options);
  ASSERT_TRUE(fit);
  EXPECT_TRUE(fit->usable());
  EXPECT_NEAR(fit->parameters[1], 0.5, 0.01);
}

struct Redundant {  // only the sum of its parameters matters
  std::vector<double> y;
  template <class T>
  bool operator()(const T* p, T* residuals) const {
    for (std::size_t i = 0; i < y.size(); ++i) residuals[i] = p[0] + p[1] - y[i];
    return true;
  }
};

TEST(LeastSquares, ReportsParametersThatTheDataDoNotTellApart) {
  const Redundant model{{1.0, 1.1, 0.9, 1.05}};
  const auto fit = fit_least_squares<2>(model, 4, std::vector<double>{0, 0});
  ASSERT_TRUE(fit);
  EXPECT_EQ(fit->stop, FitStop::rank_deficient);
  EXPECT_EQ(fit->covariance.size(), 0);
  EXPECT_FALSE(fit->usable());
  EXPECT_NEAR(fit->parameters[0] + fit->parameters[1], 1.0125, 1e-9);
}

struct Root {
  template <class T>
  bool operator()(const T* p, T* residuals) const {
    using std::sqrt;
    residuals[0] = sqrt(p[0]) - 2.0;
    residuals[1] = sqrt(p[0]) - 2.1;
    return true;
  }
};

TEST(LeastSquares, RefusesAStartWhereTheModelIsNotANumberAndStaysSilent) {
  testing::internal::CaptureStderr();
  const auto fit = fit_least_squares<1>(Root{}, 2, std::vector<double>{-1});
  const auto nan_start = fit_least_squares<1>(Root{}, 2, std::vector<double>{std::nan("")});
  EXPECT_EQ(testing::internal::GetCapturedStderr(), "");
  ASSERT_FALSE(fit);
  EXPECT_EQ(fit.error().problem, Problem::bad_number);
  ASSERT_FALSE(nan_start);
}

TEST(LeastSquares, ComesBackFromStepsToWhereTheModelIsNotANumber) {
  testing::internal::CaptureStderr();
  // Far on the flat side of the root: a full Gauss-Newton step would land at a negative argument.
  const auto fit = fit_least_squares<1>(Root{}, 2, std::vector<double>{400});
  EXPECT_EQ(testing::internal::GetCapturedStderr(), "");
  ASSERT_TRUE(fit);
  EXPECT_NEAR(fit->parameters[0], 2.05 * 2.05, 1e-6);
}

// 5 % of the points 30 sigma off, all upwards: least squares moves the intercept by 1.5 sigma, soft L1 hardly at all.
TEST(LeastSquares, RobustFitStaysWhereTheGoodPointsAre) {
  int covered = 0;
  const int kSeeds = 60;
  for (int seed = 0; seed < kSeeds; ++seed) {
    Line line = straight_line(400, 0.1, static_cast<std::uint64_t>(seed));
    for (std::size_t i = 7; i < 400; i += 20) line.y[i] += 3;
    const auto plain = fit_least_squares<2>(line, 400, std::vector<double>{0, 0});
    const auto robust = fit_least_squares<2>(line, 400, std::vector<double>{0, 0}, {.robust_scale = 2});
    ASSERT_TRUE(plain && robust);
    ASSERT_TRUE(robust->usable());
    const double middle = 2 + 0.5 * 200;
    EXPECT_GT(plain->parameters[0] + 200 * plain->parameters[1] - middle, 0.1);
    EXPECT_LT(std::abs(robust->parameters[0] + 200 * robust->parameters[1] - middle), 0.035);
    covered += std::abs(robust->parameters[1] - 0.5) < 1.96 * robust->standard_uncertainty(1) ? 1 : 0;
  }
  // 95 % of 60 is 57; 51 or fewer has a probability below 1 %.
  EXPECT_GE(covered, 52);
}

TEST(LeastSquares, RobustFitOfCleanDataIsAlmostTheOrdinaryOne) {
  const Line line = straight_line(400, 0.1, 11);
  const auto plain = fit_least_squares<2>(line, 400, std::vector<double>{0, 0});
  const auto robust = fit_least_squares<2>(line, 400, std::vector<double>{0, 0}, {.robust_scale = 3});
  ASSERT_TRUE(plain && robust);
  EXPECT_NEAR(robust->parameters[1], plain->parameters[1], 0.5 * plain->standard_uncertainty(1));
  EXPECT_NEAR(robust->standard_uncertainty(1) / plain->standard_uncertainty(1), 1, 0.1);
}

}  // namespace
}  // namespace coilassay

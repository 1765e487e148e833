#include "fitting/roll_off.h"

#include <gtest/gtest.h>

#include <cmath>
#include <vector>

#include "base/random.h"
#include "fitting/roll_off_fit.h"

namespace coilassay {
namespace {

struct Samples {
  std::vector<double> x, y;
};

/// y over an even x, with white noise on y.
Samples samples_of(const RollOff& curve, double top, std::size_t n, double noise, std::uint64_t seed, double offset = 0) {
  Samples s;
  const double x_top = curve.integral(top);
  Random random(seed);
  double y = 0;
  for (std::size_t i = 0; i < n; ++i) {
    const double h = x_top / static_cast<double>(n - 1);
    s.x.push_back(h * static_cast<double>(i));
    s.y.push_back(y + offset + noise * random.normal());
    // dy/dx = 1/g, by the classical rule.
    const double k1 = h / curve.slope(y), k2 = h / curve.slope(y + k1 / 2), k3 = h / curve.slope(y + k2 / 2),
                 k4 = h / curve.slope(y + k3);
    y += (k1 + 2 * k2 + 2 * k3 + k4) / 6;
  }
  return s;
}

TEST(RollOff, AnExponentOfTwoIsTheArctangent) {
  const RollOff curve{2, 0.25, 3, 2, 0};
  // x = 2 (0.25 y + 0.75 * 3 atan(y/3)), by hand.
  EXPECT_NEAR(curve.integral(5), 2 * (0.25 * 5 + 0.75 * 3 * std::atan(5.0 / 3)), 1e-10);
  EXPECT_NEAR(curve.integral(-5), -curve.integral(5), 1e-12);
}

TEST(RollOff, DropsAreFoundWhereTheFormulaPutsThem) {
  const RollOff curve{10e-6, 0.1, 10, 6, 0};
  // (z^6) = (1 - s)/((1 - d) - s) - 1.
  for (const double drop : {0.1, 0.2, 0.3}) {
    const double z = std::pow(0.9 / (1 - drop - 0.1) - 1, 1.0 / 6);
    EXPECT_NEAR(curve.y_at_drop(drop, 0, 15), 10 * z, 1e-9);
  }
  EXPECT_TRUE(std::isnan(curve.y_at_drop(0.3, 0, 5)));
  const double secant = curve.y_at_secant_drop(0.2, 0, 30);
  EXPECT_NEAR(curve.integral(secant) / secant, 0.8 * 10e-6, 1e-14);
  EXPECT_LT(curve.y_at_drop(0.2, 0, 30), secant);   // the mean falls later than the slope
}

TEST(RollOff, AfterARiseTheDropCountsFromTheStart) {
  const RollOff curve{1, 0.1, 10, 7, -0.3};
  EXPECT_GT(curve.largest_rise(0, 10), 1.02);
  const double y = curve.y_at_drop(0.1, 0, 20);
  EXPECT_NEAR(curve.slope(y), 0.9, 1e-9);
}

TEST(RollOffFit, FindsItsOwnParametersWithinTheirUncertainty) {
  for (const double exponent : {2.0, 3.0, 6.0, 12.0}) {
    const RollOff curve{10e-6, 0.1, 10, exponent, 0};
    const Samples s = samples_of(curve, 15, 6000, 0.08, 3, 0.25);
    const RollOffBlocks blocks = roll_off_blocks(s.x, s.y, 0, s.x.size(), 300, 0);
    RollOffKnown known;
    known.shift_sigma = 1e-9;
    const Result<RollOffFit> fit = fit_roll_off(blocks, known);
    ASSERT_TRUE(fit) << fit.error().finding;
    ASSERT_EQ(fit->fit.stop, FitStop::converged);
    EXPECT_NEAR(fit->offset, 0.25, 4 * fit->fit.standard_uncertainty(4));
    EXPECT_NEAR(std::log(fit->curve.start_slope), std::log(10e-6), 4 * fit->fit.standard_uncertainty(0));
    EXPECT_NEAR(std::log(fit->curve.exponent), std::log(exponent), 4 * fit->fit.standard_uncertainty(3));
    EXPECT_NEAR(fit->curve.y_at_drop(0.2, 0, 15), curve.y_at_drop(0.2, 0, 15), 0.02 * 10) << exponent;
    EXPECT_GT(fit->f_probability, 1e-4);
  }
}

// The hyperbolic tangent is no generalised knee; the square term follows it.
TEST(RollOffFit, ATangentIsSeenAsMisfitAndFollowedByTheSquareTerm) {
  Samples s;
  Random random(5);
  const double l0 = 9e-6, ls = 1e-6, k = 10;
  for (int i = 0; i < 8000; ++i) {
    const double x = 95e-6 * i / 7999;
    double y = x / (l0 + ls);
    for (int n = 0; n < 40; ++n) {
      const double c = std::cosh(y / k);
      y -= (ls * y + l0 * k * std::tanh(y / k) - x) / (ls + l0 / (c * c));
    }
    s.x.push_back(x);
    s.y.push_back(y + 0.003 * random.normal());
  }
  const RollOffBlocks blocks = roll_off_blocks(s.x, s.y, 0, s.x.size(), 300, 0);
  RollOffKnown known;
  known.shift_sigma = 1e-10;
  const Result<RollOffFit> knee = fit_roll_off(blocks, known);
  known.bend = true;
  const Result<RollOffFit> bend = fit_roll_off(blocks, known);
  ASSERT_TRUE(knee && bend);
  EXPECT_LT(knee->f_probability, 1e-6);
  EXPECT_LT(bend->lack_of_fit, 1.3);
  // sech^2(x/k) (0.9) + 0.1 = 0.8 at x/k = 0.4987 by hand.
  const double truth = k * std::acosh(std::sqrt(0.9 / 0.7));
  EXPECT_NEAR(bend->curve.y_at_drop(0.2, 0, 15), truth, 0.002 * truth);
  EXPECT_GT(std::fabs(knee->curve.y_at_drop(0.2, 0, 15) - truth), 0.005 * truth);
}

TEST(RollOffFit, RespondsToShiftedDataAsARefitDoes) {
  const RollOff curve{10e-6, 0.1, 10, 6, 0};
  const Samples s = samples_of(curve, 15, 6000, 0.05, 9);
  RollOffBlocks blocks = roll_off_blocks(s.x, s.y, 0, s.x.size(), 300, 0);
  RollOffKnown known;
  known.shift_sigma = 1e-9;
  const Result<RollOffFit> fit = fit_roll_off(blocks, known);
  ASSERT_TRUE(fit);
  std::vector<double> dx(blocks.x.size()), dy(blocks.x.size(), 0.0);
  for (std::size_t i = 0; i < dx.size(); ++i) dx[i] = 1e-3 * blocks.x[i];
  const Eigen::VectorXd change = fit->response(dy, dx);
  for (std::size_t i = 0; i < dx.size(); ++i) blocks.x[i] += dx[i];
  const Result<RollOffFit> again = fit_roll_off(blocks, known);
  ASSERT_TRUE(again);
  // A thousandth more x is a thousandth more slope; second order and the stop of the fit leave 3 %.
  EXPECT_NEAR(change[0], 1e-3, 3e-5);
  EXPECT_NEAR(again->fit.parameters[0] - fit->fit.parameters[0], change[0], 3e-5);
}

TEST(RollOffBlocks, NoiseInsideTheBlocksIsTheNoiseOfTheSamples) {
  const RollOff curve{1, 0.1, 10, 6, 0};
  const Samples s = samples_of(curve, 15, 20000, 0.03, 4);
  const RollOffBlocks blocks = roll_off_blocks(s.x, s.y, 0, s.x.size(), 300, 0);
  EXPECT_EQ(blocks.length, 67u);
  EXPECT_EQ(blocks.first.back() + 67, 20000u);   // to the very end
  EXPECT_NEAR(blocks.sigma, 0.03, 0.03 * 4 / std::sqrt(2 * blocks.dof));
}

TEST(RollOffBlocks, MissingSamplesTakeTheirBlockAway) {
  std::vector<double> x(2400), y(2400);
  for (std::size_t i = 0; i < x.size(); ++i) x[i] = y[i] = static_cast<double>(i);
  y[100] = std::nan("");
  EXPECT_EQ(roll_off_blocks(x, y, 0, x.size(), 300, 0).x.size(), 299u);
  EXPECT_TRUE(roll_off_blocks(x, y, 0, 20, 300, 0).x.empty());
}

TEST(RollOffSpline, HasTheSlopeOfASmoothCurve) {
  const RollOff curve{10e-6, 0.1, 10, 3, 0};
  const Samples s = samples_of(curve, 15, 6000, 0.005, 2);
  const Result<RollOffSpline> spline = RollOffSpline::fit(roll_off_blocks(s.x, s.y, 0, s.x.size(), 300, 0));
  ASSERT_TRUE(spline);
  for (const double y : {3.0, 6.0, 9.0, 12.0}) EXPECT_NEAR(spline->slope(curve.integral(y)) / curve.slope(y), 1, 0.02);
}

}  // namespace
}  // namespace coilassay

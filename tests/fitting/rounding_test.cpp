#include "fitting/rounding.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

#include "tests/fitting/ringing.h"

namespace coilassay {
namespace {

// E[round(m + e)] - m by summing over a fine grid of e.
double by_integration(double m, double noise) {
  if (noise == 0) return std::round(m) - m;
  double sum = 0, weights = 0;
  for (int i = -6000; i <= 6000; ++i) {
    const double e = i * 1e-3 * noise;
    const double weight = std::exp(-e * e / (2 * noise * noise));
    sum += weight * std::round(m + e);
    weights += weight;
  }
  return sum / weights - m;
}

TEST(Rounding, ItsMeanErrorIsTheExpectationOverTheNoise) {
  for (const double noise : {0.0, 0.02, 0.1, 0.16, 0.3, 0.5, 1.0}) {
    const MeanRounding rounding(noise);
    for (const double m : {-1.93, -0.31, 0.0, 0.07, 0.24, 0.49, 0.71, 5.13}) {
      // A place of the table is 1/2048 of a step wide; the slope is largest without noise, at a threshold.
      const double tolerance = 1.5e-3 + (noise > 0 ? 5e-4 / (2.5 * noise) : 0);
      EXPECT_NEAR(rounding.at(m), by_integration(m, noise), tolerance) << noise << " at " << m;
    }
  }
}

TEST(Rounding, MeansOverLevelsAreTheIntegral) {
  const MeanRounding rounding(0.2);
  for (const auto& [from, to] : {std::pair{0.1, 0.3}, {-0.4, 2.7}, {3.2, 3.1}, {0.0, 1.0}}) {
    double sum = 0;
    for (int i = 0; i < 10000; ++i) sum += rounding.at(from + (to - from) * (i + 0.5) / 10000);
    EXPECT_NEAR(rounding.mean(from, to), sum / 10000, 1e-4) << from << " to " << to;
  }
}

TEST(Rounding, MattersOnlyWhereNoiseDoesNotHideIt) {
  EXPECT_TRUE(rounding_matters(10000, 1, 0.1));
  EXPECT_TRUE(rounding_matters(10000, 1, 0.5));  // 0.2 % of a step against 0.6 % / 10
  EXPECT_FALSE(rounding_matters(10000, 1, 1.0));
  EXPECT_FALSE(rounding_matters(10000, std::nan(""), 0.1));
  EXPECT_FALSE(rounding_matters(10000, 0, 0.1));
}

// What is claimed is the scatter of the fit itself over signals whose levels fall anywhere between the steps.
TEST(Rounding, StatesTheScatterThatRoundingGivesTheFit) {
  const double step = 2.5 / 256;
  double scatter = 0, stated = 0;
  for (std::uint64_t i = 0; i < 60; ++i) {
    Random random(i);
    test::Ringing ringing = test::Ringing::of(8, 70, 4000);  // noise 0.02 steps
    ringing.phase = random.uniform(0, 6.283);
    ringing.offset = random.uniform(0, step);
    const auto fit = fit_damped_sine(test::rounded(ringing.record(i), step), {.resolution = step});
    ASSERT_TRUE(fit) << fit.error().finding;
    scatter += std::pow(fit->model.a - ringing.a, 2);
    stated += fit->fit.covariance(0, 0);
  }
  // The stated mean square is widened by 1.3 (u by 1.14); the scatter of 60 values is known to 9 %.
  EXPECT_NEAR(std::sqrt(stated / scatter), 1.14, 0.3);
}

}  // namespace
}  // namespace coilassay

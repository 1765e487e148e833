// What is not ringing must not be called ringing.
#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <string>
#include <vector>

#include "fitting/damped_sine.h"
#include "tests/fitting/ringing.h"

namespace coilassay {
namespace {

using test::Ringing;

TEST(DampedSineRefusal, FewerThanSixteenPresentSamplesAreTooFew) {
  std::vector<double> y = Ringing::of(3, 60, 15).record(1);
  auto fit = fit_damped_sine(y);
  ASSERT_FALSE(fit);
  EXPECT_EQ(fit.error().problem, Problem::too_few_samples);
  y = std::vector<double>(10000, std::nan(""));
  for (std::size_t i = 0; i < 15; ++i) y[600 * i] = std::cos(0.7 * static_cast<double>(i));
  fit = fit_damped_sine(y);
  ASSERT_FALSE(fit);
  EXPECT_EQ(fit.error().problem, Problem::too_few_samples);
  EXPECT_FALSE(fit_damped_sine(std::vector<double>{}));
}

TEST(DampedSineRefusal, ConstantSamplesAreNoSignal) {
  for (const double level : {0.0, 3.0, -1e6}) {
    const auto fit = fit_damped_sine(std::vector<double>(5000, level));
    ASSERT_FALSE(fit);
    EXPECT_EQ(fit.error().problem, Problem::no_signal);
  }
}

// The threshold is set for less than one false alarm in 10^4 records; none may be among these.
TEST(DampedSineRefusal, WhiteNoiseIsNeverCalledRinging) {
  const std::pair<std::size_t, int> sizes[] = {{16, 1000}, {50, 1000}, {1000, 400}, {10000, 60}, {100000, 10}};
  for (const auto& [samples, records] : sizes) {
    for (int seed = 0; seed < records; ++seed) {
      Random random(static_cast<std::uint64_t>(seed), samples);
      std::vector<double> y(samples);
      for (double& v : y) v = random.normal();
      const auto fit = fit_damped_sine(y);
      ASSERT_FALSE(fit) << samples << " samples, seed " << seed;
      EXPECT_EQ(fit.error().problem, Problem::no_signal);
    }
  }
}

TEST(DampedSineRefusal, RingingHiddenUnderNoiseIsRefusedAndVisibleRingingIsNot) {
  // Energy of the ringing over the noise variance: A^2/(4 a sigma^2) = 5 is far below what chance gives, 170 is above.
  for (const double quality : {2.0, 30.0, 300.0}) {
    const auto hidden = fit_damped_sine(Ringing::of(quality, -15, 2000).record(2));
    ASSERT_FALSE(hidden) << quality;
    EXPECT_EQ(hidden.error().problem, Problem::no_signal);
    const Ringing seen = Ringing::of(quality, 0, 2000);
    const auto fit = fit_damped_sine(seen.record(2));
    ASSERT_TRUE(fit) << quality << ": " << fit.error().finding;
    EXPECT_NEAR(fit->model.natural_omega(), seen.omega0, 2 * seen.a);
  }
}

struct Shape {
  std::string name;
  std::function<double(double)> level;  // of the place in the record, 0 to 1
};

TEST(DampedSineRefusal, DriftsStepsAndSingleExponentialsAreNoSignal) {
  const Shape shapes[] = {
      {"ramp", [](double t) { return t; }},
      {"parabola", [](double t) { return t * t; }},
      {"step in the middle", [](double t) { return t > 0.5 ? 1.0 : 0.0; }},
      {"late step", [](double t) { return t > 0.9 ? 1.0 : 0.0; }},
      {"early step", [](double t) { return t > 0.1 ? 1.0 : 0.0; }},
      {"pulse", [](double t) { return t > 0.4 && t < 0.5 ? 1.0 : 0.0; }},
      {"half a swing", [](double t) { return std::sin(3 * t + 0.4); }},
      {"one exponential", [](double t) { return std::exp(-6 * t); }},
      {"slow exponential", [](double t) { return std::exp(-t); }},
  };
  for (const Shape& shape : shapes) {
    for (const std::size_t samples : {200U, 2000U, 20000U}) {
      for (const double sigma : {1e-4, 1e-2}) {
        for (std::uint64_t seed = 0; seed < 5; ++seed) {
          Random random(seed, samples);
          std::vector<double> y(samples);
          for (std::size_t i = 0; i < samples; ++i) {
            y[i] = shape.level(static_cast<double>(i) / static_cast<double>(samples)) + sigma * random.normal();
          }
          const auto fit = fit_damped_sine(y);
          ASSERT_FALSE(fit) << shape.name << ", " << samples << " samples, noise " << sigma << ", seed " << seed;
          EXPECT_EQ(fit.error().problem, Problem::no_signal) << shape.name;
        }
      }
    }
  }
}

TEST(DampedSineRefusal, AnOverdampedDecayOfTwoExponentialsIsNotMistakenForOne) {
  const auto fit = fit_damped_sine(Ringing::of(0.35, 40, 5000).record(3));
  ASSERT_TRUE(fit) << fit.error().finding;
  EXPECT_LT(fit->model.q, 0);
  EXPECT_NEAR(fit->model.quality(), 0.35, 0.02);
}

}  // namespace
}  // namespace coilassay

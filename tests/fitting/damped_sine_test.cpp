#include "fitting/damped_sine.h"

#include <gtest/gtest.h>

#include <cmath>
#include <vector>

#include "base/random.h"

namespace coilassay {
namespace {

// A record that is stepped from the closed form by libm, sample by sample: truth does not come from the code under test.
std::vector<double> ringing(double a, double omega, double phase, double offset, double sigma, std::size_t n,
                            std::uint64_t seed) {
  Random random(seed);
  std::vector<double> y(n);
  for (std::size_t i = 0; i < n; ++i) {
    const double t = static_cast<double>(i);
    y[i] = std::exp(-a * t) * std::cos(omega * t + phase) + offset + sigma * random.normal();
  }
  return y;
}

TEST(DampedSine, RecoversDecayFrequencyAmplitudeAndOffsetWithinTheStatedUncertainty) {
  const double a = 6e-4, omega = 0.0119, phase = 0.7, offset = 0.03, sigma = 0.01;
  const auto fit = fit_damped_sine(ringing(a, omega, phase, offset, sigma, 10000, 1));
  ASSERT_TRUE(fit) << fit.error().finding;
  ASSERT_TRUE(fit->fit.usable());
  const double truth[] = {a, omega * omega, std::cos(phase), -std::sin(phase) * omega, offset};
  for (int i = 0; i < 5; ++i) {
    EXPECT_NEAR(fit->fit.parameters[i], truth[i], 4 * fit->fit.standard_uncertainty(i)) << i;
  }
  EXPECT_NEAR(fit->sigma, sigma, 0.05 * sigma);
}

}  // namespace
}  // namespace coilassay

#include "fitting/spectrum.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

namespace coilassay {
namespace {

std::vector<double> samples(std::size_t n) {
  std::vector<double> y(n);
  for (std::size_t i = 0; i < n; ++i) y[i] = std::sin(0.37 * static_cast<double>(i * i % 101)) + 0.25;
  return y;
}

// The definition itself, term by term.
std::complex<double> by_definition(const std::vector<double>& y, std::size_t k) {
  std::complex<double> sum = 0;
  for (std::size_t i = 0; i < y.size(); ++i) {
    sum += y[i] * std::polar(1.0, -2 * std::numbers::pi * static_cast<double>(k * i % y.size()) /
                                      static_cast<double>(y.size()));
  }
  return sum;
}

TEST(Spectrum, IsTheDiscreteFourierTransformForPowersOfTwoOddAndPrimeLengths) {
  for (const std::size_t n : {1U, 2U, 8U, 15U, 64U, 101U}) {
    const std::vector<double> y = samples(n);
    const auto bins = fourier(y);
    ASSERT_EQ(bins.size(), n / 2 + 1);
    for (std::size_t k = 0; k < bins.size(); ++k) {
      EXPECT_NEAR(std::abs(bins[k] - by_definition(y, k)), 0, 1e-12 * static_cast<double>(n)) << n << " " << k;
    }
  }
}

TEST(Spectrum, LeavesItsInputAloneAndRepeatsItself) {
  const std::vector<double> y = samples(256);
  const auto first = fourier(y);
  EXPECT_EQ(y, samples(256));
  EXPECT_EQ(first, fourier(y));
}

TEST(Spectrum, PowerIgnoresAnOffset) {
  std::vector<double> y = samples(128), shifted = y;
  for (double& v : shifted) v += 1000;
  const auto power = power_spectrum(y), of_shifted = power_spectrum(shifted);
  EXPECT_NEAR(power[0], 0, 1e-20);
  for (std::size_t k = 1; k < power.size(); ++k) EXPECT_NEAR(power[k], of_shifted[k], 1e-9 * (1 + power[k]));
}

}  // namespace
}  // namespace coilassay

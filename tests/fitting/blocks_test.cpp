#include "fitting/blocks.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/random.h"
#include "fitting/blocks_kernel.h"
#include "fitting/short_sums.h"

namespace coilassay {
namespace {

std::vector<double> noise(std::size_t n, std::uint64_t seed) {
  Random random(seed);
  std::vector<double> y(n);
  for (double& v : y) v = random.normal();
  return y;
}

// Term by term in long double, libm for every phase.
void expect_sums(const std::vector<double>& y, const BlockSums& sums, std::size_t block) {
  long double sum = 0, square = 0, re = 0, im = 0;
  for (std::size_t m = 0; m < sums.length; ++m) {
    const long double x = y[block * sums.length + m] - sums.reference;
    const long double phase = static_cast<long double>(sums.omega) * static_cast<long double>(m);
    sum += x;
    square += x * x;
    re += x * std::cos(phase);
    im -= x * std::sin(phase);
  }
  const double tolerance = 1e-13 * static_cast<double>(sums.length);
  EXPECT_NEAR(sums.sum[block], static_cast<double>(sum), tolerance);
  EXPECT_NEAR(sums.square[block], static_cast<double>(square), tolerance);
  if (sums.omega != 0) {
    EXPECT_NEAR(sums.demodulated[block].real(), static_cast<double>(re), tolerance);
    EXPECT_NEAR(sums.demodulated[block].imag(), static_cast<double>(im), tolerance);
  }
}

TEST(Blocks, SumsAgreeWithTheDefinitionForEveryLengthAndPhase) {
  const std::vector<double> y = noise(20000, 5);
  for (const std::size_t length : {1U, 2U, 7U, 8U, 9U, 19U, 511U, 512U, 513U, 1300U, 5000U}) {
    for (const double omega : {0.0, 0.003, 1.1, 3.0}) {
      const std::size_t count = y.size() / length;
      const BlockSums sums = block_sums(y, length, count, omega, 0.25);
      ASSERT_EQ(sums.sum.size(), count);
      expect_sums(y, sums, 0);
      expect_sums(y, sums, count / 2);
      expect_sums(y, sums, count - 1);
    }
  }
}

TEST(Blocks, AMissingSampleSpoilsItsOwnBlockOnly) {
  std::vector<double> y = noise(1000, 6);
  y[250] = std::nan("");
  const BlockSums sums = block_sums(y, 100, 10, 0.3, 0);
  for (std::size_t k = 0; k < 10; ++k) {
    EXPECT_EQ(std::isnan(sums.sum[k]), k == 2) << k;
    EXPECT_EQ(std::isnan(sums.demodulated[k].real()), k == 2) << k;
  }
  EXPECT_EQ(present_sum(y, 0).count, 999U);
}

TEST(Blocks, LongBlocksMadeOfShortOnesAreTheSumsTheySayTheyAre) {
  const std::vector<double> y = noise(9600, 12);
  ShortSums sums{.length = 16, .reference = 0.5, .sum = {}, .square = {}};
  ASSERT_TRUE(sums.complete(y));
  ASSERT_EQ(sums.sum.size(), 600U);
  const BlockSums made = block_sums(sums, 160, 60, 0.004), direct = block_sums(y, 160, 60, 0, 0.5);
  for (std::size_t k = 0; k < 60; ++k) {
    EXPECT_NEAR(made.sum[k], direct.sum[k], 1e-11);
    EXPECT_NEAR(made.square[k], direct.square[k], 1e-11);
    std::complex<double> turned = 0;
    for (std::size_t m = 0; m < 160; ++m) {
      turned += (y[k * 160 + m] - 0.5) * std::polar(1.0, -0.004 * static_cast<double>(m / 16 * 16));
    }
    EXPECT_NEAR(std::abs(made.demodulated[k] - turned), 0, 1e-11);
  }
}

TEST(Blocks, ShortSumsAreOfNoUseWithAMissingSample) {
  std::vector<double> y = noise(9600, 13);
  y[5000] = std::nan("");
  ShortSums sums{.length = 16, .reference = 0, .sum = {}, .square = {}};
  EXPECT_FALSE(sums.complete(y));
}

TEST(Blocks, BothKernelsGiveTheSameBits) {
  if (!__builtin_cpu_supports("avx2")) GTEST_SKIP() << "this processor has no AVX2";
  const std::vector<double> y = noise(4097, 7), cosine = noise(4096, 8), minus_sine = noise(4096, 9);
  for (const std::size_t offset : {0U, 1U}) {  // no alignment is assumed
    for (const std::size_t groups : {0U, 1U, 63U, 512U}) {
      kernel::Lanes a, b;
      kernel::demodulating_sse2(y.data() + offset, cosine.data(), minus_sine.data(), groups, 0.1, a);
      kernel::demodulating_avx2(y.data() + offset, cosine.data(), minus_sine.data(), groups, 0.1, b);
      kernel::Lanes c, d;
      kernel::plain_sse2(y.data() + offset, groups, 0.1, c);
      kernel::plain_avx2(y.data() + offset, groups, 0.1, d);
      for (int lane = 0; lane < 8; ++lane) {
        EXPECT_EQ(a.sum[lane], b.sum[lane]);
        EXPECT_EQ(a.square[lane], b.square[lane]);
        EXPECT_EQ(a.re[lane], b.re[lane]);
        EXPECT_EQ(a.im[lane], b.im[lane]);
        EXPECT_EQ(c.sum[lane], d.sum[lane]);
        EXPECT_EQ(c.square[lane], d.square[lane]);
      }
    }
  }
}

}  // namespace
}  // namespace coilassay

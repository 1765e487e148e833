#include <gtest/gtest.h>

#include <cmath>
#include <vector>

#include "base/random.h"
#include "fitting/damped_sine.h"

namespace coilassay {
namespace {

struct Pair {
  double a1 = 6e-4, w1 = 0.036, a2 = 6e-4, w2 = 0.0366, ratio = 0.5;
};

std::vector<double> record(const Pair& pair, double snr_db, std::size_t samples, std::uint64_t seed) {
  Random random(seed, 3);
  const double sigma = 1 / std::sqrt(2 * std::pow(10, snr_db / 10));
  const double phase1 = random.uniform(0, 6.283), phase2 = random.uniform(0, 6.283);
  std::vector<double> y(samples);
  for (std::size_t i = 0; i < samples; ++i) {
    const double n = static_cast<double>(i);
    y[i] = std::exp(-pair.a1 * n) * std::cos(pair.w1 * n + phase1) +
           pair.ratio * std::exp(-pair.a2 * n) * std::cos(pair.w2 * n + phase2) + 0.1 + sigma * random.normal();
  }
  return y;
}

// Spacings from one decay rate up, where the two modes differ by half in amplitude.
TEST(TwoDampedSines, SeparatesModesAsCloseAsOneDecayRate) {
  int covered = 0, all = 0;
  for (const double spacing : {1.0, 2.0, 8.0}) {
    for (const double snr : {20.0, 40.0, 60.0}) {
      for (std::uint64_t seed = 0; seed < 5; ++seed) {
        Pair pair;
        pair.w2 = pair.w1 + spacing * pair.a1;
        const auto fit = fit_two_damped_sines(record(pair, snr, 6000, seed));
        ASSERT_TRUE(fit) << spacing << " " << snr << " " << seed << ": " << fit.error().finding;
        ASSERT_TRUE(fit->fit.usable());
        // At 20 dB and one decay rate apart the amplitudes are uncertain by half: the modes are told by frequency.
        const int lower = fit->fit.parameters[1] < fit->fit.parameters[5] ? 0 : 4;
        const double truth[] = {pair.a1, pair.w1 * pair.w1, pair.a2, pair.w2 * pair.w2};
        const int at[] = {lower, lower + 1, 4 - lower, 5 - lower};
        for (int i = 0; i < 4; ++i) {
          const double u = fit->fit.standard_uncertainty(at[i]);
          EXPECT_NEAR(fit->fit.parameters[at[i]], truth[i], 5 * u) << spacing << " " << snr << " " << seed << " " << i;
          covered += std::abs(fit->fit.parameters[at[i]] - truth[i]) < 1.96 * u ? 1 : 0;
          ++all;
        }
        EXPECT_GT(fit->gain, 200);
      }
    }
  }
  EXPECT_GE(covered, all * 89 / 100);  // 180 values: 95 % with a standard deviation of 1.6 %
}

TEST(TwoDampedSines, PutsTheLargerModeFirst) {
  const Pair pair{.a1 = 6e-4, .w1 = 0.05, .a2 = 3e-4, .w2 = 0.044, .ratio = 0.4};
  const auto fit = fit_two_damped_sines(record(pair, 50, 8000, 1));
  ASSERT_TRUE(fit) << fit.error().finding;
  EXPECT_NEAR(fit->first.damped_omega(), pair.w1, 1e-4);
  EXPECT_NEAR(fit->second.damped_omega(), pair.w2, 1e-4);
  EXPECT_NEAR(fit->first.envelope(0), 1, 0.02);
  EXPECT_NEAR(fit->second.envelope(0), 0.4, 0.02);
  EXPECT_NEAR(fit->first.c, 0.1, 0.01);
  EXPECT_EQ(fit->second.c, 0);
  EXPECT_EQ(fit->fit.parameters[1], fit->first.q);
  EXPECT_EQ(fit->fit.parameters[5], fit->second.q);
}

TEST(TwoDampedSines, FindsAWeakModeFarAway) {
  const Pair pair{.a1 = 8e-4, .w1 = 0.05, .a2 = 2e-3, .w2 = 0.41, .ratio = 0.05};
  const auto fit = fit_two_damped_sines(record(pair, 40, 8000, 2));
  ASSERT_TRUE(fit) << fit.error().finding;
  EXPECT_NEAR(fit->second.damped_omega(), pair.w2, 5 * fit->fit.standard_uncertainty(5) / (2 * pair.w2));
  EXPECT_NEAR(fit->second.a, pair.a2, 5 * fit->fit.standard_uncertainty(4));
}

TEST(TwoDampedSines, OneModeGainsLittleFromASecond) {
  for (std::uint64_t seed = 0; seed < 8; ++seed) {
    const Pair pair{.ratio = 0};
    const auto fit = fit_two_damped_sines(record(pair, 40, 6000, seed));
    // Four parameters more, chosen freely over all frequencies: chance gives some tens at most.
    if (fit) {
      EXPECT_LT(fit->gain, 45) << seed;
    } else {
      EXPECT_EQ(fit.error().problem, Problem::not_converged);
    }
  }
}

TEST(TwoDampedSines, RefusesWhatHoldsNoOscillation) {
  const auto fit = fit_two_damped_sines(std::vector<double>(5000, 2.0));
  ASSERT_FALSE(fit);
  EXPECT_EQ(fit.error().problem, Problem::no_signal);
}

}  // namespace
}  // namespace coilassay

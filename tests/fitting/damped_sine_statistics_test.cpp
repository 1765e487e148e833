// A fixed-seed sample of tests/proof/damped_sine_bound.cpp: efficiency and honesty of the fit over many records.
#include <gtest/gtest.h>

#include <cmath>
#include <string>

#include "fitting/damped_sine.h"
#include "tests/fitting/ringing.h"

namespace coilassay {
namespace {

using test::Ringing;

// 15 cells of 40 records. v/C of one cell has a standard deviation of sqrt(2/40) = 0.22, of the mean 0.058: 1.05 is
// claimed (and proven with 6000 records), 1.2 leaves room for chance.
TEST(DampedSineStatistics, VarianceMeetsTheCramerRaoBoundAndIntervalsCover) {
  constexpr int kRecords = 40;
  double ratio_a = 0, ratio_w = 0;
  int covered_a = 0, covered_w = 0, all = 0;
  for (const double quality : {0.7, 3.0, 10.0, 100.0, 1000.0}) {
    for (const double snr : {20.0, 40.0, 60.0}) {
      Ringing ringing = Ringing::of(quality, snr, 3000);
      for (int i = 0; i < kRecords; ++i) {
        Random random(static_cast<std::uint64_t>(i), static_cast<std::uint64_t>(quality * 100 + snr));
        ringing.phase = random.uniform(0, 6.283);
        const auto bound = damped_sine_bound(ringing.truth(), ringing.samples, ringing.sigma);
        const auto fit = fit_damped_sine(ringing.record(random.bits()));
        ASSERT_TRUE(fit) << "Q " << quality << ", " << snr << " dB, record " << i << ": " << fit.error().finding;
        const double da = fit->model.a - ringing.a, dq = fit->model.q - ringing.q();
        ratio_a += da * da / (bound[0] * bound[0]);
        ratio_w += dq * dq / (bound[1] * bound[1]);
        covered_a += std::abs(da) < 1.96 * fit->fit.standard_uncertainty(0) ? 1 : 0;
        covered_w += std::abs(dq) < 1.96 * fit->fit.standard_uncertainty(1) ? 1 : 0;
        ++all;
      }
    }
  }
  EXPECT_LT(ratio_a / all, 1.2);
  EXPECT_LT(ratio_w / all, 1.2);
  EXPECT_GT(ratio_a / all, 0.8);
  EXPECT_GT(ratio_w / all, 0.8);
  // 95 % of 600 with a standard deviation of 0.9 %.
  EXPECT_NEAR(100.0 * covered_a / all, 95, 3);
  EXPECT_NEAR(100.0 * covered_w / all, 95, 3);
}

struct Coverage {
  int covered = 0, all = 0;
};

// Every record with a phase, an offset within one step and an amplitude of its own.
Coverage rounded_coverage(int bits, double snr, int records) {
  Coverage coverage;
  const double step = 2.5 / std::pow(2, bits);
  for (const double quality : {0.7, 3.0, 10.0, 100.0, 1000.0}) {
    Ringing ringing = Ringing::of(quality, snr, 4000);
    for (int i = 0; i < records; ++i) {
      Random random(static_cast<std::uint64_t>(i), static_cast<std::uint64_t>(quality * 100 + snr) + 7);
      ringing.phase = random.uniform(0, 6.283);
      ringing.offset = random.uniform(-step, step);
      const auto fit = fit_damped_sine(test::rounded(ringing.record(random.bits()), step), {.resolution = step});
      if (!fit) {
        ADD_FAILURE() << "Q " << quality << ", record " << i << ": " << fit.error().finding;
        continue;
      }
      EXPECT_EQ(fit->undithered, ringing.sigma < 0.34 * step);
      const double truth[] = {ringing.a, ringing.q()};
      for (int p = 0; p < 2; ++p) {
        const double off = std::abs(fit->fit.parameters[p] - truth[p]);
        coverage.covered += off < 1.96 * fit->fit.standard_uncertainty(p) ? 1 : 0;
        ++coverage.all;
      }
    }
  }
  return coverage;
}

TEST(DampedSineStatistics, CoversWhereNoiseDithersTheConverter) {
  const Coverage coverage = rounded_coverage(8, 40, 30);   // noise 0.72 steps
  EXPECT_GE(100.0 * coverage.covered / coverage.all, 91);  // 300 values: standard deviation 1.3 %
}

TEST(DampedSineStatistics, CoversWhereNoiseIsFarBelowAStep) {
  const Coverage coarse = rounded_coverage(8, 60, 30);  // noise 0.07 steps
  EXPECT_GE(100.0 * coarse.covered / coarse.all, 91);
  const Coverage between = rounded_coverage(10, 60, 30);  // 0.29 steps
  EXPECT_GE(100.0 * between.covered / between.all, 91);
}

TEST(DampedSineStatistics, NotesThatAnUnditheredTailIsLeftOut) {
  const double step = 2.5 / 256;
  const Ringing ringing = Ringing::of(100, 60, 10000);
  const auto fit = fit_damped_sine(test::rounded(ringing.record(1), step), {.resolution = step});
  ASSERT_TRUE(fit) << fit.error().finding;
  EXPECT_TRUE(fit->undithered);
  // The envelope is 1 at the start and one step at ln(102.4)/a = 7715.
  EXPECT_NEAR(static_cast<double>(fit->samples), std::log(1 / step) / ringing.a, 30);
}

TEST(DampedSineStatistics, ColouredNoiseIsSeenInBand) {
  // Noise that hangs together over 5 samples has five times the variance at low frequencies.
  Ringing ringing = Ringing::of(1.5, 40, 20000);
  Random random(5);
  std::vector<double> y = ringing.levels();
  double wander = 0;
  const double keep = std::exp(-0.2);
  for (double& v : y) {
    wander = keep * wander + std::sqrt(1 - keep * keep) * random.normal();
    v += 0.01 * wander;
  }
  const auto fit = fit_damped_sine(y);
  ASSERT_TRUE(fit) << fit.error().finding;
  EXPECT_NEAR(fit->sigma_per_sample, 0.01, 0.0005);
  EXPECT_GT(fit->sigma_in_band, 0.025);
  EXPECT_EQ(fit->sigma, fit->sigma_in_band);
}

TEST(DampedSineStatistics, ShortRecordsSayHowManyDegreesOfFreedomTheyHave) {
  const auto fit = fit_damped_sine(Ringing::of(5, 40, 60).record(3));
  ASSERT_TRUE(fit) << fit.error().finding;
  EXPECT_EQ(fit->dof, 55);
}

}  // namespace
}  // namespace coilassay

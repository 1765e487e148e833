#include "fitting/damped_sine.h"

#include <gtest/gtest.h>

#include <Eigen/LU>
#include <cmath>
#include <string>
#include <vector>

#include "base/random.h"
#include "tests/fitting/ringing.h"

namespace coilassay {
namespace {

using test::Ringing;

void expect_within(const DampedSineFit& fit, const DampedSine& truth, double sigmas, const std::string& what) {
  const double expected[] = {truth.a, truth.q, truth.p, truth.s, truth.c};
  for (int i = 0; i < 5; ++i) {
    EXPECT_NEAR(fit.fit.parameters[i], expected[i], sigmas * fit.fit.standard_uncertainty(i)) << what << ", " << i;
  }
}

TEST(DampedSine, RecoversAllFiveParametersWithinTheStatedUncertaintyFromOverdampedToSharp) {
  for (const double quality : {0.35, 0.45, 0.5, 0.51, 0.7, 1.0, 3.0, 10.0, 100.0, 1000.0}) {
    for (const double snr : {20.0, 40.0, 60.0}) {
      const Ringing ringing = Ringing::of(quality, snr, 10000);
      const auto fit = fit_damped_sine(ringing.record(1));
      const std::string what = "Q " + std::to_string(quality) + ", " + std::to_string(snr) + " dB";
      ASSERT_TRUE(fit) << what << ": " << fit.error().finding;
      ASSERT_TRUE(fit->fit.usable()) << what;
      // 150 comparisons: 4.5 sigma is exceeded once in a thousand such tests.
      expect_within(*fit, ringing.truth(), 4.5, what);
      EXPECT_NEAR(fit->sigma, ringing.sigma, 0.05 * ringing.sigma) << what;
      EXPECT_FALSE(fit->undithered);
    }
  }
}

TEST(DampedSine, IsExactOnNoiseFreeRecordsWhateverTheBlocks) {
  for (const double quality : {0.4, 0.5, 0.7, 5.0, 50.0, 700.0}) {
    for (const std::size_t samples : {100U, 3001U, 40000U}) {
      Ringing ringing = Ringing::of(quality, 40, samples);
      const auto fit = fit_damped_sine(ringing.levels());
      ASSERT_TRUE(fit) << quality << " " << samples << ": " << fit.error().finding;
      // Rounding of 1e-16 against a bound of about sqrt(10/N) for sigma 1.
      EXPECT_NEAR(fit->model.natural_omega() / ringing.omega0, 1, 1e-9) << quality << " " << samples;
      EXPECT_NEAR(fit->model.a / ringing.a, 1, 1e-9) << quality << " " << samples;
    }
  }
}

TEST(DampedSine, AnOffsetAThousandTimesTheRingingDoesNotDisturb) {
  Ringing ringing = Ringing::of(30, 40, 20000);
  ringing.offset = 1000;
  const auto fit = fit_damped_sine(ringing.record(3));
  ASSERT_TRUE(fit) << fit.error().finding;
  expect_within(*fit, ringing.truth(), 4, "offset");
}

TEST(DampedSine, ALongTailOfNoiseCostsNothing) {
  // The same ringing, recorded for 6 and for 300 of its time constants.
  for (const double quality : {0.7, 4.0, 40.0}) {
    Ringing ringing = Ringing::of(quality, 30, 2000);
    const auto brief = fit_damped_sine(ringing.record(4));
    ringing.samples = 100000;
    const auto extended = fit_damped_sine(ringing.record(4));
    ASSERT_TRUE(brief && extended) << quality;
    expect_within(*extended, ringing.truth(), 4, "long");
    EXPECT_LT(extended->fit.standard_uncertainty(0), 1.03 * brief->fit.standard_uncertainty(0)) << quality;
    EXPECT_NEAR(extended->fit.standard_uncertainty(0) / damped_sine_bound(ringing.truth(), 100000, ringing.sigma)[0], 1,
                0.06);
  }
}

// Long enough that slow ringing is fitted from sums that were made on the way, plain and demodulated.
TEST(DampedSine, MillionsOfSamplesAreFittedAsWellAsThousands) {
  for (const double quality : {0.6, 2.0, 20.0, 90.0, 400.0}) {
    const Ringing ringing = Ringing::of(quality, 30, 1500000);
    const auto fit = fit_damped_sine(ringing.record(13));
    ASSERT_TRUE(fit) << quality << ": " << fit.error().finding;
    expect_within(*fit, ringing.truth(), 4.5, "Q " + std::to_string(quality));
    const auto bound = damped_sine_bound(ringing.truth(), ringing.samples, ringing.sigma);
    EXPECT_NEAR(fit->fit.standard_uncertainty(0) / bound[0], 1, 0.02) << quality;
    EXPECT_NEAR(fit->fit.standard_uncertainty(1) / bound[1], 1, 0.02) << quality;
    EXPECT_NEAR(fit->sigma, ringing.sigma, 0.005 * ringing.sigma) << quality;
  }
}

TEST(DampedSine, AWindowOfOneTimeConstantIsEnough) {
  const Ringing ringing = Ringing::of(50, 40, 8000, 1);
  const auto fit = fit_damped_sine(ringing.record(5));
  ASSERT_TRUE(fit) << fit.error().finding;
  expect_within(*fit, ringing.truth(), 4, "one time constant");
}

TEST(DampedSine, ToleratesScatteredMissingSamplesAndGaps) {
  for (const double quality : {0.8, 8.0, 80.0}) {
    const Ringing ringing = Ringing::of(quality, 40, 10000);
    for (const double fraction : {0.0005, 0.02, 0.3}) {
      std::vector<double> y = ringing.record(6);
      Random random(7);
      std::size_t missing = 0;
      for (double& v : y) {
        if (random.uniform() < fraction) {
          v = std::nan("");
          ++missing;
        }
      }
      const auto fit = fit_damped_sine(y);
      ASSERT_TRUE(fit) << quality << " " << fraction << ": " << fit.error().finding;
      expect_within(*fit, ringing.truth(), 4, "scattered");
      // No more is lost than the samples that are missing and a twentieth.
      const double present = 1 - static_cast<double>(missing) / 10000;
      const double bound = damped_sine_bound(ringing.truth(), 10000, ringing.sigma)[0] / std::sqrt(present);
      EXPECT_LT(fit->fit.standard_uncertainty(0), 1.08 * bound) << quality << " " << fraction;
    }
    std::vector<double> y = ringing.record(8);
    for (std::size_t i = 400; i < 1900; ++i) y[i] = std::nan("");
    const auto fit = fit_damped_sine(y);
    ASSERT_TRUE(fit) << quality << ": " << fit.error().finding;
    expect_within(*fit, ringing.truth(), 4, "gap");
  }
}

TEST(DampedSine, FindsASlowRingingInALongRecordOfWhichEveryFewSamplesAreMissing) {
  const Ringing ringing = Ringing::of(1.5, 40, 200000);
  std::vector<double> y = ringing.record(10);
  Random random(11);
  for (double& v : y) {
    if (random.uniform() < 0.03) v = std::nan("");
  }
  const auto fit = fit_damped_sine(y);
  ASSERT_TRUE(fit) << fit.error().finding;
  expect_within(*fit, ringing.truth(), 4, "scattered in a long record");
}

TEST(DampedSine, BeginsAtAGivenFrequencyAndForgivesAWrongOne) {
  const Ringing ringing = Ringing::of(60, 40, 10000);
  const std::vector<double> y = ringing.record(9);
  const auto found = fit_damped_sine(y);
  const auto given = fit_damped_sine(y, {.near_omega = ringing.omega0 * 1.001});
  const auto wrong = fit_damped_sine(y, {.near_omega = ringing.omega0 * 3});
  ASSERT_TRUE(found && given && wrong);
  for (const auto* fit : {&*given, &*wrong}) {
    EXPECT_NEAR(fit->model.q, found->model.q, 0.05 * found->fit.standard_uncertainty(1));
  }
}

TEST(DampedSine, EvaluatesItsModelAlongARecordAsSampleBySample) {
  for (const double q : {0.7, 1e-4, 1e-12, 0.0, -1e-8}) {
    const DampedSine model{2e-4, q, 0.8, 0.3 * std::sqrt(std::abs(q)), 0.1};
    std::vector<double> y(3001);
    evaluate(model, 1e4, y);
    for (std::size_t i = 0; i < y.size(); ++i) {
      ASSERT_NEAR(y[i], model(1e4 + static_cast<double>(i)), 1e-12) << q << " " << i;
    }
  }
}

TEST(DampedSine, ItsPhaseIsRightAfterTenMillionSamples) {
  // q = 1/4 exactly: half a radian per sample, so that 10^7 samples are 5 10^6 rad.
  std::vector<double> y(1000);
  evaluate({0, 0.25, 1, 0, 0}, 1e7, y);
  for (std::size_t i = 0; i < y.size(); ++i) {
    const long double phase = 5e6L + 0.5L * static_cast<long double>(i);
    ASSERT_NEAR(y[i], static_cast<double>(std::cos(phase)), 2e-12);
  }
}

// Numerical second derivatives of chi-square of the libm levels: nothing of the fit is used.
TEST(DampedSine, TheBoundIsTheInverseOfTheFisherInformation) {
  const Ringing ringing = Ringing::of(3, 40, 500);
  const auto level = [](const Eigen::VectorXd& t, double n) {
    const double w = std::sqrt(t[1]);
    return std::exp(-t[0] * n) * (t[2] * std::cos(w * n) + t[3] * std::sin(w * n) / w) + t[4];
  };
  const DampedSine m = ringing.truth();
  Eigen::VectorXd truth(5);
  truth << m.a, m.q, m.p, m.s, m.c;
  Eigen::MatrixXd information = Eigen::MatrixXd::Zero(5, 5);
  for (int n = 0; n < 500; ++n) {
    Eigen::VectorXd slope(5);
    for (int i = 0; i < 5; ++i) {
      const double h = 1e-5 * std::max(std::abs(truth[i]), 1e-6);
      Eigen::VectorXd up = truth, down = truth;
      up[i] += h;
      down[i] -= h;
      slope[i] = (level(up, n) - level(down, n)) / (2 * h);
    }
    information += slope * slope.transpose();
  }
  const Eigen::VectorXd scale = information.diagonal().cwiseSqrt().cwiseInverse();
  const Eigen::MatrixXd inverse = (scale.asDiagonal() * information * scale.asDiagonal()).inverse();
  const Eigen::VectorXd bound = damped_sine_bound(m, 500, ringing.sigma);
  for (int i = 0; i < 5; ++i) {
    EXPECT_NEAR(bound[i], ringing.sigma * scale[i] * std::sqrt(inverse(i, i)), 1e-4 * bound[i]) << i;
  }
}

// limits: u(a) = u(w) = 4 (sigma/A) sqrt(a^3) for a high Q and a long record (derived; within 0.3 % at Q 100).
TEST(DampedSine, TheBoundMeetsTheFormulaForHighQuality) {
  const Ringing ringing = Ringing::of(100, 40, 100000, 30);
  const Eigen::VectorXd bound = damped_sine_bound(ringing.truth(), 100000, ringing.sigma);
  const double formula = 4 * ringing.sigma * std::pow(ringing.a, 1.5);
  EXPECT_NEAR(bound[0] / formula, 1, 0.003);
  EXPECT_NEAR(bound[1] / (2 * std::sqrt(ringing.q())) / formula, 1, 0.003);
}

}  // namespace
}  // namespace coilassay

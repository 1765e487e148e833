// One frequency in two channels: efficiency, honest covariance, starts from few to many cycles.
#include "fitting/sine_fit.h"

#include <gtest/gtest.h>

#include <Eigen/Cholesky>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <string>

#include "base/random.h"

namespace coilassay {
namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;
using Complex = std::complex<double>;

struct Two {
  std::vector<double> v, i;
  double omega = 0, centre = 0;
  Complex v_phasor, i_phasor;
};

struct Bench {
  std::size_t samples = 2000;
  double cycles = 20.3;
  double amplitude_v = 1, amplitude_i = 0.8;
  double phase_v = 0.3, phase_i = -1.2;
  double sigma_v = 0.01, sigma_i = 0.0056;
  double step_v = 0, step_i = 0;              // rounding
  double third_i = 0;                         // harmonic of the second channel
  std::uint64_t seed = 1;
};

Two simulate(const Bench& b) {
  Two two;
  two.omega = kTwoPi * b.cycles / static_cast<double>(b.samples);
  two.centre = (static_cast<double>(b.samples) - 1) / 2;
  two.v_phasor = std::polar(b.amplitude_v, b.phase_v);
  two.i_phasor = std::polar(b.amplitude_i, b.phase_i);
  Random random(b.seed);
  const auto rounded = [](double y, double step) { return step > 0 ? std::nearbyint(y / step) * step : y; };
  for (std::size_t n = 0; n < b.samples; ++n) {
    const double angle = two.omega * (static_cast<double>(n) - two.centre);
    const double v = (two.v_phasor * std::polar(1.0, angle)).real() + 0.1 + b.sigma_v * random.normal();
    const double i = (two.i_phasor * std::polar(1.0, angle)).real() - 0.02 + b.sigma_i * random.normal() +
                     b.third_i * std::cos(3 * angle + 0.4);
    two.v.push_back(rounded(v, b.step_v));
    two.i.push_back(rounded(i, b.step_i));
  }
  return two;
}

Result<SineFit> fit(const Two& two, const Bench& b = {}) {
  const auto step = [](double s) { return s > 0 ? s : std::nan(""); };
  const SineChannel channels[] = {{two.v, step(b.step_v)}, {two.i, step(b.step_i)}};
  return fit_sines(channels);
}

struct Score {
  double variance = 0;   // of the log ratio and of omega, over the bound
  double omega_variance = 0;
  double chi_square = 0;  // of the parameters with the stated covariance, 7 expected
  int misses = 0, refused = 0;
  double covered = 0;    // of the modulus of V/I at k = 1.96
};

Score repeat(Bench b, int count) {
  Score score;
  for (int t = 0; t < count; ++t) {
    b.seed = static_cast<std::uint64_t>(1000 + t);
    Random random(b.seed + 77);
    b.phase_v = kTwoPi * random.uniform();
    b.phase_i = b.phase_v - 1.5 + 0.2 * random.uniform();
    const Two two = simulate(b);
    const auto found = fit(two, b);
    if (!found) {
      ++score.refused;
      continue;
    }
    const double n = static_cast<double>(b.samples);
    const Complex ratio = found->channels[0].phasor / found->channels[1].phasor / (two.v_phasor / two.i_phasor);
    const double bound = 2 / n * (std::pow(b.sigma_v / b.amplitude_v, 2) + std::pow(b.sigma_i / b.amplitude_i, 2));
    score.variance += std::norm(ratio - 1.0) / 2 / bound / count;
    const double amplitude[] = {b.amplitude_v, b.amplitude_i}, sigma[] = {b.sigma_v, b.sigma_i};
    score.omega_variance += std::pow((found->omega - two.omega) / sine_omega_bound(b.samples, amplitude, sigma), 2) / count;
    Eigen::VectorXd truth(7);
    truth << two.omega, two.v_phasor.real(), two.v_phasor.imag(), 0.1, two.i_phasor.real(), two.i_phasor.imag(), -0.02;
    const Eigen::VectorXd off = found->fit.parameters - truth;
    const Eigen::VectorXd scale = found->fit.covariance.diagonal().cwiseSqrt().cwiseInverse();
    const Eigen::MatrixXd unit = scale.asDiagonal() * found->fit.covariance * scale.asDiagonal();
    const Eigen::VectorXd in_u = scale.asDiagonal() * off;
    score.chi_square += in_u.dot(unit.ldlt().solve(in_u)) / count;
    // |V/I| by its gradient.
    Eigen::VectorXd g = Eigen::VectorXd::Zero(7);
    const auto& [cv, ci] = std::pair{found->channels[0].phasor, found->channels[1].phasor};
    g[1] = cv.real() / std::norm(cv), g[2] = cv.imag() / std::norm(cv);
    g[4] = -ci.real() / std::norm(ci), g[5] = -ci.imag() / std::norm(ci);
    const double u = std::sqrt(g.dot(found->fit.covariance * g));
    score.covered += std::fabs(std::log(std::abs(ratio))) <= 1.96 * u ? 1.0 / count : 0;
  }
  return score;
}

TEST(SineFit, FindsBothPhasorsAndTheFrequencyExactlyWithoutNoise) {
  for (const double cycles : {1.7, 3.2, 7.9, 8.1, 37.4, 311.9}) {
    const Two two = simulate({.samples = 3000, .cycles = cycles, .sigma_v = 0, .sigma_i = 0});
    const auto found = fit(two);
    ASSERT_TRUE(found) << cycles << ": " << found.error().finding;
    EXPECT_NEAR(found->omega / two.omega, 1, 1e-10) << cycles;
    EXPECT_LT(std::abs(found->channels[0].phasor - two.v_phasor), 1e-8) << cycles;
    EXPECT_LT(std::abs(found->channels[1].phasor - two.i_phasor), 1e-8) << cycles;
    EXPECT_NEAR(found->channels[0].offset, 0.1, 1e-8) << cycles;
    EXPECT_NEAR(found->channels[1].offset, -0.02, 1e-8) << cycles;
  }
}

// 300 draws of each: the variance ratio scatters by about 6 %, pooled over the lengths 3 %.
TEST(SineFit, IsAsGoodAsTheBoundAllowsFromFewToManyCycles) {
  double pooled = 0, pooled_omega = 0;
  int count = 0;
  for (const double cycles : {4.6, 20.3, 137.2, 701.7}) {
    const Score s = repeat({.samples = 4000, .cycles = cycles}, 300);
    EXPECT_EQ(s.refused, 0) << cycles;
    EXPECT_NEAR(s.chi_square, 7, 0.8) << cycles;
    EXPECT_NEAR(s.covered, 0.95, 0.04) << cycles;
    pooled += s.variance, pooled_omega += s.omega_variance, ++count;
  }
  EXPECT_LT(pooled / count, 1.05 + 0.06);
  EXPECT_GT(pooled / count, 0.9);
  EXPECT_NEAR(pooled_omega / count, 1, 0.13);
}

// With less than two cycles the bound for many does not hold, but the stated covariance must.
TEST(SineFit, StatesAnHonestCovarianceForFewCyclesAndFewSamples) {
  for (const auto& [samples, cycles] : {std::pair{300, 1.7}, {300, 2.4}, {40, 3.3}}) {
    const Score s = repeat({.samples = static_cast<std::size_t>(samples), .cycles = cycles}, 300);
    EXPECT_EQ(s.refused, 0) << cycles;
    EXPECT_NEAR(s.chi_square, 7, samples < 100 ? 2 : 0.9) << cycles;
    EXPECT_GT(s.covered, 0.9) << cycles;
  }
}

TEST(SineFit, FollowsAHundredThousandCycles) {
  const Bench b{.samples = 400000, .cycles = 1e5 + 0.37, .sigma_v = 0.1, .sigma_i = 0.05};
  const Two two = simulate(b);
  const auto found = fit(two);
  ASSERT_TRUE(found) << found.error().finding;
  EXPECT_NEAR(found->cycles, b.cycles, 1e-3);
  EXPECT_LT(std::abs(found->channels[0].phasor - two.v_phasor), 5 * 0.1 * std::sqrt(2.0 / 400000));
}

TEST(SineFit, AWeakChannelFollowsTheFrequencyOfTheStrongOne) {
  Bench b{.samples = 20000, .cycles = 411.3, .sigma_v = 0.01, .sigma_i = 20};
  const Two two = simulate(b);
  const auto found = fit(two);
  ASSERT_TRUE(found) << found.error().finding;
  EXPECT_NEAR(found->cycles, b.cycles, 1e-3);
  EXPECT_NEAR(found->channels[1].sigma, 20, 1);
  EXPECT_LT(std::abs(found->channels[1].phasor - two.i_phasor), 5 * 20 * std::sqrt(2.0 / 20000));
}

// Eight bits: fine dither, none at all, and the hardest case, a whole number of samples a period.
TEST(SineFit, StaysHonestOnQuantisedRecords) {
  for (const double noise : {0.5, 0.0}) {
    for (const double cycles : {20.0, 20.37}) {
      const double step = 2.4 / 256;
      const Score s = repeat({.samples = 2000, .cycles = cycles, .sigma_v = noise * step, .sigma_i = noise * step,
                              .step_v = step, .step_i = step}, 200);
      EXPECT_EQ(s.refused, 0);
      EXPECT_GT(s.covered, 0.9) << noise << " of a step, cycles " << cycles;
    }
  }
}

TEST(SineFit, AThirdHarmonicDoesNotLeanOnTheFundamental) {
  for (const double cycles : {3.4, 20.3}) {
    const Bench b{.samples = 3000, .cycles = cycles, .sigma_v = 1e-4, .sigma_i = 1e-4, .third_i = 0.08};
    const Two two = simulate(b);
    const auto found = fit(two);
    ASSERT_TRUE(found) << found.error().finding;
    EXPECT_LT(std::abs(found->channels[1].phasor - two.i_phasor), 8e-5) << cycles;
    EXPECT_LT(std::abs(found->channels[1].harmonics[1] - std::polar(0.08, 0.4)), 8e-5) << cycles;
    EXPECT_LT(std::abs(found->channels[0].harmonics[1]), 5 * found->channels[0].harmonic_u) << cycles;
    EXPECT_NEAR(found->channels[1].sigma, 1e-4, 1.5e-5) << cycles;
  }
}

TEST(SineFit, MissingSamplesAreLeftOut) {
  const Bench b{.samples = 4000, .cycles = 33.3};
  Two two = simulate(b);
  for (std::size_t n = 1000; n < 1400; ++n) two.v[n] = std::nan("");
  for (std::size_t n = 0; n < 4000; n += 97) two.i[n] = std::nan("");
  const auto found = fit(two);
  ASSERT_TRUE(found) << found.error().finding;
  EXPECT_LT(std::abs(found->channels[0].phasor - two.v_phasor), 5 * 0.01 * std::sqrt(2.0 / 3600));
  EXPECT_LT(std::abs(found->channels[1].phasor - two.i_phasor), 5 * 0.0056 * std::sqrt(2.0 / 3500));
  EXPECT_LE(found->channels[0].samples, 3600u);
}

TEST(SineFit, RefusesNoiseAndConstantsAndTooFewSamples) {
  int taken = 0;
  for (int t = 0; t < 200; ++t) {
    const Two two = simulate({.samples = 1000, .amplitude_v = 0, .amplitude_i = 0, .seed = static_cast<std::uint64_t>(t)});
    taken += fit(two).has_value() ? 1 : 0;
  }
  EXPECT_EQ(taken, 0);
  const std::vector<double> flat(100, 0.5), few(8, 0.1);
  const SineChannel constant[] = {{flat}, {flat}};
  EXPECT_FALSE(fit_sines(constant));
  const SineChannel short_ones[] = {{few}, {few}};
  const auto refused = fit_sines(short_ones);
  ASSERT_FALSE(refused);
  EXPECT_EQ(refused.error().problem, Problem::too_few_samples);
}

// One channel alone is the four-parameter fit of IEEE 1057. For a whole number of periods the three-parameter solution
// is the plain projection, so the amplitude must equal it (closed form, from memory).
TEST(SineFit, OneChannelOverWholePeriodsIsTheProjection) {
  const Bench b{.samples = 1000, .cycles = 25, .sigma_v = 1e-3};
  const Two two = simulate(b);
  const SineChannel channel[] = {{two.v}};
  const auto found = fit_sines(channel);
  ASSERT_TRUE(found);
  Complex projected = 0;
  for (std::size_t n = 0; n < 1000; ++n) {
    projected += two.v[n] * std::polar(2.0 / 1000, -two.omega * (static_cast<double>(n) - two.centre));
  }
  // The fitted frequency differs from the true one by its own error, which moves the modulus in second order only.
  EXPECT_NEAR(std::abs(found->channels[0].phasor), std::abs(projected), 2e-6);
  // Standard uncertainty of the amplitude: sigma sqrt(2/N).
  const Complex a = found->channels[0].phasor;
  Eigen::Vector2d g(a.real() / std::abs(a), a.imag() / std::abs(a));
  const double u = std::sqrt(g.dot(found->fit.covariance.block<2, 2>(1, 1) * g));
  EXPECT_NEAR(u / (found->channels[0].sigma * std::sqrt(2.0 / 1000)), 1, 0.01);
}

}  // namespace
}  // namespace coilassay

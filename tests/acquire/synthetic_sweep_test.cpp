#include "acquire/synthetic/coil_sweep.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

namespace coilassay::synthetic {
namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;

// A coil with C across: Im Z = 0 at w^2 = 1/(L C) - (R/L)^2, by hand from Im of (R + jwL)/(1 - w^2 L C + jwRC).
TEST(SyntheticSweep, SelfResonanceIsTheZeroOfTheReactance) {
  CoilSweepBench bench{.inductance_h = 100e-6, .resistance_ohm = 500, .parallel_capacitance_f = 10e-12, .stop_hz = 1e6};
  const double w2 = 1 / (100e-6 * 10e-12) - std::pow(500 / 100e-6, 2);
  const auto record = simulate_coil_sweep(bench);
  ASSERT_TRUE(record);
  EXPECT_NEAR(record->truth.f_r_hz, std::sqrt(w2) / kTwoPi, 1e-6 * std::sqrt(w2));  // beyond the span, still the coil's
  EXPECT_NEAR(record->truth.f_parallel_hz, 1 / (kTwoPi * std::sqrt(1e-15)), 1);
}

// Apparent inductance and resistance far enough below resonance: L/(1 - x^2), R/(1 - x^2)^2 for small R.
TEST(SyntheticSweep, ApparentValuesRiseTowardsResonance) {
  const CoilSweepBench bench{.inductance_h = 100e-6, .resistance_ohm = 0.01, .parallel_capacitance_f = 10e-12};
  const double f_r = 1 / (kTwoPi * std::sqrt(1e-15));
  for (const double x : {0.1, 0.2, 0.3}) {
    const std::complex<double> z = coil_impedance(bench, x * f_r);
    EXPECT_NEAR(z.imag() / (kTwoPi * x * f_r), 100e-6 / (1 - x * x), 1e-12);
    EXPECT_NEAR(z.real(), 0.01 / std::pow(1 - x * x, 2), 1e-8);
  }
}

// The skin law has equal resistance and reactance; the relaxation is half its plateau at its corner, and grows with f^2 below.
TEST(SyntheticSweep, LossLawsHaveTheirShapes) {
  CoilSweepBench bench{.inductance_h = 1e-12, .resistance_ohm = 0, .skin_ohm = 2, .skin_frequency_hz = 1e6,
                       .parallel_capacitance_f = 0};
  const auto skin = coil_impedance(bench, 4e6);
  EXPECT_NEAR(skin.real(), 4, 1e-12);
  EXPECT_NEAR(skin.imag() - kTwoPi * 4e6 * 1e-12, 4, 1e-12);
  bench.skin_ohm = 0;
  bench.inductance_h = 1e-6;
  bench.proximity_ohm = 3;
  bench.proximity_frequency_hz = 1e6;
  EXPECT_NEAR(coil_impedance(bench, 1e6).real(), 1.5, 1e-12);
  EXPECT_NEAR(coil_impedance(bench, 2e3).real() / coil_impedance(bench, 1e3).real(), 4, 1e-4);
  // Far above its corner a part of the inductance is gone.
  EXPECT_NEAR(coil_impedance(bench, 1e9).imag() / (kTwoPi * 1e9), 1e-6 - 3 / (kTwoPi * 1e6), 1e-11);
}

// The second tank is a short where it resonates, but for 1/(w C Q).
TEST(SyntheticSweep, SecondTankShortsTheCoilAtItsResonance) {
  const CoilSweepBench bench{.second_frequency_hz = 2e7, .second_capacitance_f = 5e-12, .second_q = 100};
  const double left = 1 / (kTwoPi * 2e7 * 5e-12 * 100);
  EXPECT_NEAR(std::abs(coil_impedance(bench, 2e7)), left, 0.02 * left);
}

TEST(SyntheticSweep, NoiseHasTheStatedSizeAndTheSeedDecides) {
  const CoilSweepBench bench{.points = 5000, .noise_ratio = 1e-3, .seed = 3};
  const auto first = simulate_coil_sweep(bench), again = simulate_coil_sweep(bench);
  ASSERT_TRUE(first && again);
  EXPECT_EQ(first->sweep.z_ohm, again->sweep.z_ohm);
  double sum = 0;
  for (std::size_t i = 0; i < bench.points; ++i) {
    sum += std::norm(first->sweep.z_ohm[i][0] / coil_impedance(bench, first->sweep.frequency_hz[i]) - 1.0);
  }
  EXPECT_NEAR(sum / (2 * 5000 * 1e-6), 1, 5 / std::sqrt(5000.0));  // chi-square of 10000 parts, five sigma
}

TEST(SyntheticSweep, SpoiltPointsStandWhereTheTruthSays) {
  const auto record = simulate_coil_sweep({.outliers = 4, .marked = 3, .seed = 5});
  ASSERT_TRUE(record);
  ASSERT_EQ(record->truth.outliers.size(), 4U);
  ASSERT_EQ(record->truth.marked.size(), 3U);
  std::size_t off = 0;
  for (std::size_t i = 0; i < record->sweep.frequency_hz.size(); ++i) {
    const double ratio = std::abs(record->sweep.z_ohm[i][0] / coil_impedance({}, record->sweep.frequency_hz[i]) - 1.0);
    off += ratio > 1e-9;
  }
  EXPECT_EQ(off, 7U);
  for (const std::size_t at : record->truth.marked) EXPECT_TRUE(record->sweep.bad[at]);
  for (const std::size_t at : record->truth.outliers) EXPECT_FALSE(record->sweep.bad[at]);
}

TEST(SyntheticSweep, ScatteringNoiseIsConstantInS) {
  const CoilSweepBench bench{.points = 2000, .scattering_noise = 1e-4};
  const auto record = simulate_coil_sweep(bench);
  ASSERT_TRUE(record);
  EXPECT_EQ(record->sweep.as_read, "S");
  const auto s = [](std::complex<double> z) { return (z - 50.0) / (z + 50.0); };
  double low = 0, high = 0;
  for (std::size_t i = 0; i < 2000; ++i) {
    const double e = std::norm(s(record->sweep.z_ohm[i][0]) - s(coil_impedance(bench, record->sweep.frequency_hz[i])));
    (i < 1000 ? low : high) += e / (1000 * 2e-8);
  }
  EXPECT_NEAR(low, 1, 0.15);
  EXPECT_NEAR(high, 1, 0.15);
}

TEST(SyntheticSweep, WhatNoBenchCanHaveIsRefused) {
  EXPECT_FALSE(simulate_coil_sweep({.inductance_h = -1e-6}));
  EXPECT_FALSE(simulate_coil_sweep({.start_hz = 1e6, .stop_hz = 1e3}));
  EXPECT_FALSE(simulate_coil_sweep({.points = 1}));
  EXPECT_FALSE(simulate_coil_sweep({.points = 10, .outliers = 8, .marked = 8}));
  const auto refused = simulate_coil_sweep({.noise_ratio = std::nan("")});
  ASSERT_FALSE(refused);
  EXPECT_NE(refused.error().finding.find("noise"), std::string::npos);
}

}  // namespace
}  // namespace coilassay::synthetic

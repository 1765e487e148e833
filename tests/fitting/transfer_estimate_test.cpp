// Welch's spectra and what follows from them, on records whose ratio and noise are known.
#include "fitting/transfer_estimate.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>
#include <vector>

#include "base/random.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;

/// y[n] = 2 x[n] - x[n-1]: its ratio is 2 - e^{-jw} exactly, and it remembers one sample.
struct Pair {
  std::vector<double> x, y;
};

Complex ratio_at(double cycles_per_sample) { return 2.0 - std::polar(1.0, -2 * std::numbers::pi * cycles_per_sample); }

Pair noise_through(std::size_t count, double x_noise, double y_noise, std::uint64_t seed) {
  Pair p;
  Random source(seed), nx(seed, 1), ny(seed, 2);
  double before = source.normal();
  for (std::size_t n = 0; n < count; ++n) {
    const double now = source.normal();
    p.x.push_back(now + x_noise * nx.normal());
    p.y.push_back(2 * now - before + y_noise * ny.normal());
    before = now;
  }
  return p;
}

std::vector<std::size_t> bins_between(const TransferSpectra& s, double low, double high) {
  std::vector<std::size_t> bins;
  for (std::size_t k = 1; k < s.segment / 2; ++k) {
    const double f = static_cast<double>(k) / static_cast<double>(s.segment);
    if (f > low && f < high) bins.push_back(k);
  }
  return bins;
}

TEST(TransferEstimate, WhiteNoiseHasItsVarianceAsPowerInEveryBin) {
  const Pair p = noise_through(200000, 0, 0, 1);
  const TransferSpectra s = welch_spectra(p.x, p.x, 512);
  double mean = 0, restless = 0;
  for (std::size_t k = 2; k < 255; ++k) {
    mean += s.xx[k] / 253;
    restless += s.restlessness[k] / 253;
  }
  EXPECT_NEAR(mean, 1, 0.01);      // 200 000 samples: 0.3 %
  EXPECT_NEAR(restless, 2, 0.05);  // complex normal
}

TEST(TransferEstimate, ErrorsAreAsLargeAsTheCoherenceSays) {
  // Over 60 records: the r.m.s. of (error / formula) over band and records; one record alone scatters by some percent.
  double sum = 0, count = 0;
  for (std::uint64_t seed = 1; seed <= 60; ++seed) {
    const Pair p = noise_through(32768, 0, 0.1, seed);
    const TransferSpectra s = welch_spectra(p.x, p.y, 256);
    for (const std::size_t k : bins_between(s, 0.05, 0.45)) {
      const double f = static_cast<double>(k) / 256;
      sum += std::norm(s.h1(k) / ratio_at(f) - 1.0) / 2 / std::pow(random_error_of(s.coherence(k), s.averages()), 2);
      count += 1;
    }
  }
  EXPECT_NEAR(std::sqrt(sum / count), 1, 0.05);
}

TEST(TransferEstimate, OverlappingSegmentsAreWorthAsManyAveragesAsStated) {
  // Var of a bin's power over its square is 1/averages; 400 records of 21 segments.
  double first = 0, second = 0;
  const int records = 400;
  double averages = 0;
  for (int r = 0; r < records; ++r) {
    const Pair p = noise_through(11 * 64, 0, 0, 1000 + static_cast<std::uint64_t>(r));
    const TransferSpectra s = welch_spectra(p.x, p.x, 64);
    averages = s.averages();
    for (std::size_t k = 3; k < 30; k += 3) {
      first += s.xx[k];
      second += s.xx[k] * s.xx[k];
    }
  }
  const double n = records * 9.0, mean = first / n;
  EXPECT_NEAR((second / n - mean * mean) / (mean * mean) * averages, 1, 0.08);  // 3600 values: 4 % of a variance
}

TEST(TransferEstimate, TellsWhoseNoiseItIs) {
  const Pair p = noise_through(1 << 20, 0.05, 0.02, 3);
  const TransferSpectra s = welch_spectra(p.x, p.y, 1024);
  const WhiteNoise noise = white_noise_of(s, bins_between(s, 0.01, 0.49));
  ASSERT_TRUE(noise.told_apart);
  EXPECT_NEAR(noise.x, 0.0025, 4 * noise.u_x + 2e-5);   // second order: x y is left out, 4e-7 of 0.0025
  EXPECT_NEAR(noise.y, 0.0004, 4 * noise.u_y);
  EXPECT_LT(noise.u_x, 0.03 * 0.0025);
  // Noise of x makes h1 small by it, and the truth stands between h1 and h2.
  double h1 = 0, h2 = 0;
  const auto bins = bins_between(s, 0.2, 0.45);
  for (const std::size_t k : bins) {
    const Complex truth = ratio_at(static_cast<double>(k) / 1024);
    h1 += (s.h1(k) / truth).real() / static_cast<double>(bins.size());
    h2 += (s.h2(k) / truth).real() / static_cast<double>(bins.size());
  }
  EXPECT_NEAR(h1, 1 - 0.0025, 2e-4);
  EXPECT_GT(h2, 1);
}

TEST(TransferEstimate, SegmentsWithMissingSamplesAreLeftOut) {
  Pair p = noise_through(4096, 0, 0, 5);
  const std::size_t all = welch_spectra(p.x, p.y, 256).segments;
  p.y[1000] = std::nan("");
  const TransferSpectra s = welch_spectra(p.x, p.y, 256);
  EXPECT_EQ(all, 31u);
  EXPECT_EQ(s.segments, 29u);
  for (const std::size_t k : bins_between(s, 0.05, 0.45)) EXPECT_TRUE(std::isfinite(s.yy[k]));
}

TEST(TransferEstimate, WhatComesByOnceIsRestless) {
  std::vector<double> chirp(65536);
  for (std::size_t n = 0; n < chirp.size(); ++n) {
    const double t = static_cast<double>(n) / 65536;
    chirp[n] = std::sin(2 * std::numbers::pi * 65536 * (0.01 * t + 0.2 * t * t));
  }
  const TransferSpectra s = welch_spectra(chirp, chirp, 1024);
  EXPECT_GT(s.restlessness[200], 8);
}

}  // namespace
}  // namespace coilassay

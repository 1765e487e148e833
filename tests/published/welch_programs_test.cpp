// Welch's spectra against general-purpose reference software: SciPy's welch, csd and coherence.
#include <gtest/gtest.h>
#include <unistd.h>

#include <array>
#include <cmath>
#include <complex>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "base/random.h"
#include "fitting/transfer_estimate.h"
#include "tests/support/paths.h"

namespace coilassay {
namespace {

namespace fs = std::filesystem;

std::string output_of(const std::string& command) {
  std::string text;
  std::FILE* pipe = ::popen(command.c_str(), "r");
  if (pipe == nullptr) return text;
  std::array<char, 4096> part{};
  while (const std::size_t n = std::fread(part.data(), 1, part.size(), pipe)) text.append(part.data(), n);
  ::pclose(pipe);
  return text;
}

// SciPy 1.10, scipy.signal: Hann, half overlap, mean taken away, as here. One-sided densities are twice ours. Both are the
// same sums; they differ by rounding only.
TEST(ReferenceSoftware, SciPyFindsTheSameSpectraAndCoherence) {
  std::vector<double> x, y;
  Random random(4);
  double before = 0;
  for (int n = 0; n < 10000; ++n) {
    const double now = random.normal();
    x.push_back(now + 0.3);
    y.push_back(now - 0.6 * before + 0.5 * random.normal() - 7);
    before = now;
  }
  const fs::path file = fs::temp_directory_path() / ("coilassay-welch-" + std::to_string(::getpid()) + ".f64");
  {
    std::ofstream out(file, std::ios::binary);
    for (const auto* each : {&x, &y}) {
      out.write(reinterpret_cast<const char*>(each->data()), static_cast<std::streamsize>(each->size() * sizeof(double)));
    }
  }
  for (const std::size_t segment : {64u, 500u, 2048u}) {
    std::istringstream answer(output_of("/usr/bin/python3 " + test::project_file("tests/published/welch_scipy.py") + " " +
                                        file.string() + " " + std::to_string(segment)));
    const TransferSpectra s = welch_spectra(x, y, segment);
    std::size_t bins = 0;
    for (double f = 0, xx = 0, yy = 0, re = 0, im = 0, g = 0; answer >> f >> xx >> yy >> re >> im >> g; ++bins) {
      ASSERT_LT(bins, s.xx.size());
      if (bins < 2 || bins + 1 == s.xx.size()) continue;  // the ends are not doubled, and the mean is taken away there
      EXPECT_NEAR(f, static_cast<double>(bins) / static_cast<double>(segment), 1e-15);
      EXPECT_NEAR(2 * s.xx[bins] / xx, 1, 1e-10);
      EXPECT_NEAR(2 * s.yy[bins] / yy, 1, 1e-10);
      EXPECT_LT(std::abs(2.0 * s.xy[bins] - std::complex(re, im)), 1e-10 * std::abs(std::complex(re, im)) + 1e-14);
      EXPECT_NEAR(s.coherence(bins), g, 1e-10);
    }
    EXPECT_EQ(bins, s.xx.size()) << "scipy did not run";
  }
  fs::remove(file);
}

}  // namespace
}  // namespace coilassay

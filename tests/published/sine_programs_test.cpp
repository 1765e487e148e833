// The common sine against general-purpose reference software: SciPy's curve_fit.
#include <gtest/gtest.h>
#include <unistd.h>

#include <array>
#include <cmath>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <numbers>
#include <sstream>

#include "analysis/sine.h"
#include "tests/support/paths.h"
#include "tests/support/sine_bench.h"

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

// SciPy 1.10, scipy.optimize.curve_fit (Levenberg-Marquardt on every sample of both channels): both are the least-squares
// solution, so they agree far within the noise. A fifth of u is the limit.
TEST(ReferenceSoftware, SciPyFindsTheSameImpedance) {
  const fs::path file = fs::temp_directory_path() / ("coilassay-sine-" + std::to_string(::getpid()) + ".txt");
  for (const double cycles : {2.6, 17.3, 205.9}) {
    synthetic::DrivenSineBench bench;
    bench.samples = 5000;
    bench.sample_interval_s = cycles / bench.frequency_hz / 5000;
    bench.voltage_noise_v = 0.02;
    bench.current_noise_a = 2e-4;
    bench.seed = 12;
    const auto record = test::simulated_sine(bench);
    const Measurement m = test::measured_sine(record.capture, test::exact_sine_request(bench));
    ASSERT_NE(m.find("Z"), nullptr);
    {
      std::ofstream out(file);
      out.precision(17);
      for (std::size_t n = 0; n < 5000; ++n) {
        out << record.capture.channels[0].samples[n] << " " << record.capture.channels[1].samples[n] << "\n";
      }
    }
    const double step = record.capture.time.step_s;
    std::ostringstream command;
    command.precision(15);
    command << "/usr/bin/python3 " << test::project_file("tests/published/sine_scipy.py") << " " << file << " "
            << 2 * std::numbers::pi * bench.frequency_hz * step * (1 + 1e-5) << " 0.02 2e-4";
    std::istringstream answer(output_of(command.str()));
    double omega = 0, z = 0, phi = 0, u_omega = 0, u_z = 0, u_phi = 0;
    const bool read = static_cast<bool>(answer >> omega >> z >> phi >> u_omega >> u_z >> u_phi);
    fs::remove(file);
    ASSERT_TRUE(read) << "python3-scipy is needed for this test";
    const Quantity f = m.find("f")->quantity, modulus = m.find("Z")->quantity, phase = m.find("phi")->quantity;
    EXPECT_NEAR(f.value, omega / (2 * std::numbers::pi * step), f.standard_uncertainty / 5) << cycles;
    EXPECT_NEAR(modulus.value, z, modulus.standard_uncertainty / 5) << cycles;
    EXPECT_NEAR(phase.value, phi, phase.standard_uncertainty / 5) << cycles;
    EXPECT_NEAR(modulus.standard_uncertainty, u_z, 0.06 * u_z) << cycles;
    EXPECT_NEAR(phase.standard_uncertainty, u_phi, 0.06 * u_phi) << cycles;
  }
}

}  // namespace
}  // namespace coilassay

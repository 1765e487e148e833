// Ring-down against general-purpose reference software: SciPy's curve_fit and the circuit simulator ngspice.
#include <gtest/gtest.h>
#include <unistd.h>

#include <array>
#include <cmath>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <numbers>
#include <sstream>

#include "analysis/ring_down.h"
#include "tests/support/paths.h"
#include "tests/support/ring_down_bench.h"

namespace coilassay {
namespace {

namespace fs = std::filesystem;

/// A folder of the test's own, gone when the test ends.
class Scratch {
 public:
  Scratch() : path_(fs::temp_directory_path() / ("coilassay-test-" + std::to_string(::getpid()))) {
    fs::create_directories(path_);
  }
  ~Scratch() { fs::remove_all(path_); }
  fs::path file(const std::string& name) const { return path_ / name; }

 private:
  fs::path path_;
};

std::string output_of(const std::string& command) {
  std::string text;
  std::FILE* pipe = ::popen(command.c_str(), "r");
  if (pipe == nullptr) return text;
  std::array<char, 4096> part{};
  while (const std::size_t n = std::fread(part.data(), 1, part.size(), pipe)) text.append(part.data(), n);
  ::pclose(pipe);
  return text;
}

// SciPy 1.10, scipy.optimize.curve_fit (Levenberg-Marquardt on every sample), on the same window of the same capture:
// both are the least-squares solution, so they agree far within the noise. A fifth of u is the limit.
TEST(ReferenceSoftware, SciPyFindsTheSameDecay) {
  const Scratch scratch;
  for (const double resistance : {0.35, 3.5, 35.0}) {
    synthetic::RingDownBench bench;
    bench.resistance_ohm = resistance;
    bench.samples = 6000;
    bench.noise_v = 0.03;
    bench.seed = 21;
    const auto record = test::simulated(bench);
    RingDownRequest request = test::exact_request(bench);
    const Measurement result = test::measured(record.capture, request);
    ASSERT_NE(result.find("f_0"), nullptr);

    const auto& axis = record.capture.time;
    const fs::path file = scratch.file("window.txt");
    {
      std::ofstream out(file);
      out.precision(17);
      const auto first = static_cast<std::size_t>(std::lround((result.model->window_s->first - axis.start_s) / axis.step_s));
      const auto last = static_cast<std::size_t>(std::lround((result.model->window_s->second - axis.start_s) / axis.step_s));
      for (std::size_t i = first; i <= last; ++i) out << record.capture.channels[0].samples[i] << "\n";
    }
    std::ostringstream command;
    command.precision(12);
    command << "/usr/bin/python3 " << test::project_file("tests/published/ring_down_scipy.py") << " " << file << " " << axis.step_s
            << " " << record.truth.alpha_per_s << " " << 2 * std::numbers::pi * record.truth.f_d_hz;
    std::istringstream answer(output_of(command.str()));
    double alpha = 0, omega = 0, u_alpha = 0, u_omega = 0;
    ASSERT_TRUE(answer >> alpha >> omega >> u_alpha >> u_omega) << "python3-scipy is needed for this test";
    const Quantity a = result.find("alpha")->quantity, f = result.find("f_d")->quantity;
    EXPECT_NEAR(a.value, alpha, a.standard_uncertainty / 5) << resistance;
    EXPECT_NEAR(f.value, omega / (2 * std::numbers::pi), f.standard_uncertainty / 5) << resistance;
    EXPECT_NEAR(a.standard_uncertainty, u_alpha, 0.1 * u_alpha) << resistance;
  }
}

// ngspice 39 (trapezoid, 5 ns): its own error is (w h)^2/12 in frequency, 2e-7 here; the grid is not exactly even, so the
// record goes through the resampling too.
TEST(ReferenceSoftware, NgspiceRingDownGivesItsCoilBack) {
  const Scratch scratch;
  const fs::path netlist = scratch.file("ring.cir"), data = scratch.file("ring.txt");
  std::ofstream(netlist) << "ring-down of 1 mH and 0.5 ohm across 10 nF and 20 kohm\n"
                            "Lx a b 1m ic=0\nRs b 0 0.5\nC1 a 0 10n ic=10\nRp a 0 20k\n"
                            ".options reltol=1e-7 abstol=1e-15 vntol=1e-13 chgtol=1e-21 method=trap\n"
                            ".control\nset wr_singlescale\nset numdgt=15\ntran 5n 1m 0 5n uic\nwrdata "
                         << data.string() << " v(a)\nquit\n.endc\n.end\n";
  output_of("ngspice -b " + netlist.string() + " 2>&1");
  std::ifstream in(data);
  ASSERT_TRUE(in) << "ngspice is needed for this test";
  Capture capture;
  capture.source.name = "ngspice";
  Channel channel;
  channel.name = "v(a)";
  channel.unit = Unit::volt;
  double t = 0, v = 0;
  while (in >> t >> v) {
    capture.time.times_s.push_back(t);
    channel.samples.push_back(v);
  }
  ASSERT_GT(channel.samples.size(), 100000U);
  capture.channels.push_back(std::move(channel));
  RingDownRequest request;
  request.propagation.exact_bench = true;
  request.bench.capacitors.push_back({StatedValue::exact(10e-9, Unit::farad), std::nullopt});
  request.bench.across_resistance = StatedValue::exact(20e3, Unit::ohm);
  request.from_s = 1e-6;
  const Measurement result = test::measured(capture, request);
  ASSERT_NE(result.find("L_s"), nullptr);
  EXPECT_NEAR(result.find("L_s")->quantity.value, 1e-3, 2e-6 * 1e-3);
  EXPECT_NEAR(result.find("R_s")->quantity.value, 0.5, 2e-3 * 0.5);  // alpha good to 1e-5, nine tenths of it the 20 kohm
}

}  // namespace
}  // namespace coilassay

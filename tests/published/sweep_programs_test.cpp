// The circuit of a sweep against general-purpose reference software: SciPy's least_squares and the circuit simulator ngspice.
#include <gtest/gtest.h>
#include <unistd.h>

#include <array>
#include <cmath>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <sstream>
#include <string>

#include "fitting/circuit_fit.h"
#include "tests/support/paths.h"
#include "tests/support/sweep_draws.h"

namespace coilassay {
namespace {

namespace fs = std::filesystem;
using P = CircuitParameter;

std::string output_of(const std::string& command) {
  std::string text;
  std::FILE* pipe = ::popen(command.c_str(), "r");
  if (pipe == nullptr) return text;
  std::array<char, 4096> part{};
  while (const std::size_t n = std::fread(part.data(), 1, part.size(), pipe)) text.append(part.data(), n);
  ::pclose(pipe);
  return text;
}

fs::path scratch(const std::string& name) { return fs::temp_directory_path() / ("coilassay-" + std::to_string(::getpid()) + "-" + name); }

// SciPy 1.10, scipy.optimize.least_squares (trust region, derivatives by three-point differences), started at 1.3 times the truth:
// both are the least-squares solution.
TEST(SweepReferenceSoftware, SciPyFindsTheSameMinimum) {
  const fs::path file = scratch("sweep.txt");
  const test::SweepTruth truth{.r = 0.05, .l = 22e-6, .c = 12e-12, .g = 1 / 20e3, .skin = 0.3, .low_hz = 1e3, .high_hz = 3e7};
  for (const double noise : {1e-3, 1e-2}) {
    Random random(7);
    const auto sweep = test::make_sweep(truth, 201, noise, random);
    const auto fit = fit_circuit({.frequency_hz = sweep.f, .z = sweep.z, .u = {noise}}, {.parallel_loss = true, .skin = true});
    ASSERT_TRUE(fit && fit->usable());
    {
      std::ofstream out(file);
      out.precision(17);
      for (std::size_t i = 0; i < sweep.f.size(); ++i) out << sweep.f[i] << " " << sweep.z[i].real() << " " << sweep.z[i].imag() << "\n";
    }
    std::ostringstream command;
    command.precision(15);
    command << "/usr/bin/python3 " << test::project_file("tests/published/sweep_scipy.py") << " " << file << " " << noise << " "
            << truth.reference_hz();
    for (const double value : {truth.r, truth.l, truth.c, truth.g, truth.skin}) command << " " << 1.3 * value;
    std::istringstream answer(output_of(command.str()));
    double chi = 0;
    std::array<double, 5> values{}, u{};
    answer >> chi;
    for (double& v : values) answer >> v;
    for (double& v : u) answer >> v;
    ASSERT_TRUE(answer) << "python3-scipy is needed for this test";
    EXPECT_NEAR(fit->chi_square, chi, 1e-6 * chi);
    for (std::size_t i = 0; i < 5; ++i) {
      EXPECT_NEAR(fit->value(fit->order[i]), values[i], 1e-3 * u[i]) << i;   // of a standard deviation
      EXPECT_NEAR(fit->standard_uncertainty(fit->order[i]), u[i], 1e-3 * u[i]) << i;
    }
  }
  fs::remove(file);
}

struct Spice {
  const char* name;
  const char* elements;   // a current of 1 A flows into node a
  CircuitFamily family;
  std::array<double, kCircuitParameters> values;   // reference 100 kHz
};

// R_rel of 100 ohm across 20 % of 100 uH at 100 kHz: R_rel = (w_ref k L)^2/R_e, by the low end of the parallel circuit. The tank:
// L_2 = 1/(w_2^2 C_2), R_2 = D_2 w_2 L_2 with 5 pF, 2 uH, 40 ohm.
const double kRef = 2 * std::numbers::pi * 1e5;
const double kTank = 1 / (2 * std::numbers::pi * std::sqrt(2e-6 * 5e-12));
const std::array<Spice, 4> kCircuits = {{
    {"RLC", "Rs a b 0.5\nLx b 0 1m\nCp a 0 100p\n", {}, {0.5, 1e-3, 100e-12}},
    {"ParallelLoss", "Rs a b 0.5\nLx b 0 1m\nCp a 0 100p\nRp a 0 100k\n", {.parallel_loss = true}, {0.5, 1e-3, 100e-12, 1e-5}},
    {"Relaxation", "Rs a b 0.2\nLx b c 80u\nLe c 0 20u\nRe c 0 100\nCp a 0 10p\n", {.relaxation = true},
     {0.2, 100e-6, 10e-12, 0, 0, std::pow(kRef * 20e-6, 2) / 100, 0.2}},
    {"SecondTank", "Rs a b 0.2\nLx b 0 100u\nCp a 0 10p\nRp a 0 50k\nC2 a d 5p\nL2 d e 2u\nR2 e 0 40\n",
     {.parallel_loss = true, .second_resonance = true},
     {0.2, 100e-6, 10e-12, 2e-5, 0, 0, 0, 5e-12, kTank, 40 * std::sqrt(5e-12 / 2e-6)}},
}};

class SweepBySpice : public testing::TestWithParam<Spice> {};

// ngspice 39, AC analysis with 15 digits.
TEST_P(SweepBySpice, IsFollowedAndItsElementsFound) {
  const Spice& spice = GetParam();
  const fs::path netlist = scratch("sweep.cir"), table = scratch("sweep.dat");
  std::ofstream(netlist) << "coil\nI1 0 a ac 1\n" << spice.elements << ".control\nset wr_singlescale\nset wr_vecnames\nset numdgt=15\n"
                         << "ac dec 40 1k 100meg\nwrdata " << table.string() << " v(a)\nquit\n.endc\n.end\n";
  output_of("ngspice -b " + netlist.string() + " 2>&1");
  std::ifstream in(table);
  ASSERT_TRUE(in) << "ngspice is needed for this test";
  std::string heading;
  std::getline(in, heading);
  CircuitData data;
  data.u = {1e-4};
  for (double f = 0, re = 0, im = 0; in >> f >> re >> im;) {
    data.frequency_hz.push_back(f);
    data.z.emplace_back(re, im);
  }
  fs::remove(netlist);
  fs::remove(table);
  ASSERT_GT(data.size(), 190U);

  Circuit circuit;
  circuit.family = spice.family;
  circuit.reference_hz = 1e5;
  circuit.values = spice.values;
  for (std::size_t i = 0; i < data.size(); ++i) {
    // The simulator adds conductances: beside 1/R of the series resistor that of the whole, 1/Z, keeps fewer digits.
    const double digits = 1e-12 + 3e-16 * std::abs(data.z[i]) / circuit[P::series_resistance];
    EXPECT_LT(std::abs(impedance(circuit, data.frequency_hz[i]) / data.z[i] - 1.0), digits) << data.frequency_hz[i];
  }

  CircuitFitOptions options;
  options.reference_hz = 1e5;
  const auto fit = fit_circuit(data, spice.family, options);
  ASSERT_TRUE(fit && fit->usable());
  for (const P p : fit->order) EXPECT_NEAR(fit->value(p) / circuit[p], 1, 1e-7) << name(p);   // digits of the table over how little a part may show
  const auto f_r = falling_zero_hz(circuit, 1e3, 1e8), fitted = falling_zero_hz(fit->circuit, 1e3, 1e8);
  ASSERT_TRUE(f_r && fitted);
  EXPECT_NEAR(*fitted / *f_r, 1, 1e-10);

  // Nobody says which family it is. Errors of 1e-4 are stated, there are none: any larger family only costs.
  CircuitChoiceOptions choose;
  choose.reference_hz = 1e5;
  const auto choice = choose_circuit(data, choose);
  ASSERT_TRUE(choice);
  EXPECT_EQ(choice->best.circuit.family, spice.family) << name(choice->best.circuit.family);
}

INSTANTIATE_TEST_SUITE_P(Circuits, SweepBySpice, testing::ValuesIn(kCircuits), [](const auto& one) { return std::string(one.param.name); });

}  // namespace
}  // namespace coilassay

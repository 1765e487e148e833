#include "report/ramp_netlist.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <sstream>

#include "report/child_process.h"

namespace coilassay {
namespace {

using testing::HasSubstr;
using testing::Not;

/// A coil whose flux is an arctangent: 1 uH i + 90 uWb atan(i/10 A).
Measurement arctangent_coil(const std::string& name) {
  Measurement m;
  m.test = "ramp";
  Source source;
  source.name = name;
  m.sources.push_back({source, 10000, 1e-9});
  m.corrections.push_back({"winding resistance", 0.05, Unit::ohm});
  Table curve{"curve", {{"current_A", Unit::ampere, {}}, {"flux_Wb", Unit::weber, {}}}};
  for (int k = 0; k <= 100; ++k) {
    const double i = 0.15 * k;
    curve.columns[0].values.push_back(i);
    curve.columns[1].values.push_back(1e-6 * i + 90e-6 * std::atan(i / 10));
  }
  m.tables.push_back(std::move(curve));
  return m;
}

TEST(RampNetlist, ASimulatorFollowsTheCurve) {
  const auto ngspice = find_program("ngspice");
  ASSERT_TRUE(ngspice) << "ngspice is needed for this test";
  const Result<ScratchFolder> folder = ScratchFolder::make();
  ASSERT_TRUE(folder);
  const auto netlist = ramp_netlist(arctangent_coil("coil.csv"), "coilassay 0.1.0");
  ASSERT_TRUE(netlist);
  std::ofstream(folder->path() / "run.cir")
      << "ramp of the coil that was written\n" << *netlist
      << "V1 in 0 pwl(0 0 1n 10)\nX1 in 0 coil\n.options reltol=1e-6 abstol=1e-9\n"
         ".control\nset wr_singlescale\nset numdgt=15\ntran 5n 10u 0 5n uic\nwrdata out.txt i(V1)\nquit\n.endc\n.end\n";
  const Result<ChildOutcome> run =
      run_child({.program = *ngspice, .arguments = {"-b", "run.cir"}, .input = "", .folder = folder->path()});
  ASSERT_TRUE(run);
  std::ifstream in(folder->path() / "out.txt");
  double t = 0, current = 0, last_t = 0, last_i = 0;
  while (in >> t >> current) last_t = t, last_i = -current;
  ASSERT_NEAR(last_t, 10e-6, 1e-9) << run->output << run->messages;
  // The same circuit by the classical rule, in 20000 steps.
  double i = 0;
  const double h = last_t / 20000;
  const auto slope = [](double x) { return (10 - 0.05 * x) / (1e-6 + 9e-6 / (1 + x * x / 100)); };
  for (int k = 0; k < 20000; ++k) {
    const double k1 = slope(i), k2 = slope(i + h / 2 * k1), k3 = slope(i + h / 2 * k2), k4 = slope(i + h * k3);
    i += h / 6 * (k1 + 2 * k2 + 2 * k3 + k4);
  }
  // Straight pieces of 0.15 A lie off the arctangent by less than 1e-4 of the flux.
  EXPECT_NEAR(last_i, i, 1e-3 * i);
}

TEST(RampNetlist, ANameFromOutsideCannotRunCommands) {
  const auto netlist = ramp_netlist(arctangent_coil("x\n.control\nshell rm -rf;.csv"), "coilassay 0.1.0");
  ASSERT_TRUE(netlist);
  EXPECT_THAT(*netlist, Not(HasSubstr(".control")));
  EXPECT_THAT(*netlist, Not(HasSubstr("shell rm")));
  std::istringstream lines(*netlist);
  std::string line;
  int commands = 0;
  while (std::getline(lines, line)) commands += line.starts_with('.') ? 1 : 0;
  EXPECT_EQ(commands, 2);   // .subckt and .ends
}

TEST(RampNetlist, WithoutACurveThereIsNone) {
  Measurement m = arctangent_coil("coil.csv");
  m.tables.clear();
  EXPECT_FALSE(ramp_netlist(m, "coilassay 0.1.0"));
}

}  // namespace
}  // namespace coilassay

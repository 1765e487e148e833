#include "report/sweep_netlist.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <fstream>
#include <numbers>
#include <sstream>

#include "report/child_process.h"

namespace coilassay {
namespace {

using testing::HasSubstr;
using testing::Not;
using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;

/// A measurement whose circuit has these elements.
Measurement coil(const std::map<std::string, double>& elements, const std::string& file = "coil.csv") {
  Measurement m;
  m.test = "sweep";
  Source source;
  source.name = file;
  m.sources.push_back({source, 201, std::nan("")});
  Estimate l;
  l.symbol = "L";
  l.quantity = {elements.at("L"), 1e-9, Unit::henry};
  m.estimates.push_back(l);
  m.model = ModelSummary{};
  for (const auto& [key, value] : elements) m.model->parameters[key] = {value, std::nan(""), Unit::one};
  return m;
}

struct Row {
  double f;
  Complex z;
};

/// Impedance of the subcircuit by ngspice, `bias` ampere through it.
std::vector<Row> simulated(const std::string& netlist, double low, double high, double bias = 0) {
  const auto ngspice = find_program("ngspice");
  EXPECT_TRUE(ngspice) << "ngspice is needed for this test";
  const Result<ScratchFolder> folder = ScratchFolder::make();
  if (!ngspice || !folder) return {};
  std::ofstream(folder->path() / "run.cir")
      << "impedance of the coil that was written\n" << netlist << "I1 0 p dc " << bias << " ac 1\nX1 p 0 coil\n.control\n"
      << "set wr_singlescale\nset numdgt=15\nac dec 40 " << low << ' ' << high << "\nwrdata out.txt v(p)\nquit\n.endc\n.end\n";
  const Result<ChildOutcome> run =
      run_child({.program = *ngspice, .arguments = {"-b", "run.cir"}, .input = "", .folder = folder->path()});
  EXPECT_TRUE(run);
  std::ifstream in(folder->path() / "out.txt");
  std::vector<Row> rows;
  double f = 0, re = 0, im = 0;
  while (in >> f >> re >> im) rows.push_back({f, {re, im}});
  if (rows.empty()) ADD_FAILURE() << run->output << run->messages;
  return rows;
}

/// The elements' impedance, written down once more.
Complex closed_form(const std::map<std::string, double>& e, double f) {
  const auto value = [&](const char* key) { return e.contains(key) ? e.at(key) : 0; };
  const Complex s(0, kTwoPi * f);
  const double x = f / value("f_ref");
  Complex series = value("R") + s * value("L") + Complex(1, 1) * value("R_skin") * std::sqrt(x);
  if (e.contains("R_rel")) {
    const double w_ref = kTwoPi * value("f_ref"), tau = value("R_rel") / (value("k_rel") * value("L") * w_ref * w_ref);
    series += value("R_rel") * x * x / (1.0 + s * tau);
  }
  Complex y = 1.0 / series + s * value("C") + value("G");
  if (e.contains("C_2")) {
    const double v = f / value("f_2");
    y += s * value("C_2") / Complex(1 - v * v, value("D_2") * v);
  }
  return 1.0 / y;
}

struct Case {
  const char* what;
  std::map<std::string, double> elements;
};

class SweepNetlist : public testing::TestWithParam<Case> {};

// Two to a decade the trapezoidal rule is within 0.04 % of the skin effect's own part; the goal for Z is 0.5 %.
TEST_P(SweepNetlist, ASimulatorFollowsTheFittedImpedance) {
  const auto netlist = sweep_netlist(coil(GetParam().elements), 1e3, 3e7, "coilassay 0.1.0");
  ASSERT_TRUE(netlist);
  for (const Row& row : simulated(*netlist, 1e3, 3e7)) {
    const Complex z = closed_form(GetParam().elements, row.f);
    EXPECT_LT(std::abs(row.z / z - 1.0), 1e-3) << row.f;
    // R on its own: losses are what a ladder is for.
    EXPECT_NEAR(row.z.real() / z.real(), 1, 5e-3) << row.f;
  }
}

INSTANTIATE_TEST_SUITE_P(
    Circuits, SweepNetlist,
    testing::Values(Case{"plain", {{"R", 0.5}, {"L", 100e-6}, {"C", 10e-12}, {"f_ref", 2e5}}},
                    Case{"skin", {{"R", 0.05}, {"L", 100e-6}, {"C", 10e-12}, {"G", 5e-6}, {"R_skin", 0.4}, {"f_ref", 2e5}}},
                    Case{"skin alone", {{"R", 1e-6}, {"L", 1e-6}, {"C", 1e-12}, {"R_skin", 0.2}, {"f_ref", 2e5}}},
                    Case{"relaxation", {{"R", 0.2}, {"L", 22e-6}, {"C", 8e-12}, {"R_rel", 0.05}, {"k_rel", 0.3}, {"f_ref", 2e5}}},
                    Case{"second", {{"R", 0.5}, {"L", 100e-6}, {"C", 10e-12}, {"G", 1e-6}, {"C_2", 4e-12}, {"f_2", 2e7}, {"D_2", 0.05}, {"f_ref", 2e5}}}),
    [](const auto& each) {
      std::string text = each.param.what;
      for (char& c : text) c = c == ' ' ? '_' : c;
      return text;
    });

SaturationLaw arctangent() {
  SaturationLaw law{"ramp.json", {}, {}};
  for (int k = 0; k <= 200; ++k) {
    law.current_a.push_back(0.05 * k);
    law.flux_wb.push_back(90e-6 * std::atan(0.05 * k / 3));   // 30 uH at zero, 3 A knee
  }
  return law;
}

// The ramp says 30 uH at small current, the sweep 33 uH: the law keeps its shape and takes the sweep's value.
TEST(SweepNetlistSaturation, InductanceFollowsTheCurrentAndIsThatOfTheSweepAtZero) {
  const std::map<std::string, double> elements = {{"R", 0.2}, {"L", 33e-6}, {"C", 8e-12}, {"R_skin", 0.1}, {"f_ref", 2e5}};
  const SaturationLaw law = arctangent();
  const auto netlist = sweep_netlist(coil(elements), 1e3, 1e6, "coilassay 0.1.0", &law);
  ASSERT_TRUE(netlist);
  for (const Row& row : simulated(*netlist, 1e3, 1e6)) {
    EXPECT_LT(std::abs(row.z / closed_form(elements, row.f) - 1.0), 5e-3) << row.f;
  }
  auto at_knee = elements;
  at_knee["L"] = 33e-6 / 2;   // 1/(1 + (3/3)^2)
  for (const Row& row : simulated(*netlist, 1e3, 1e6, 3.025)) {   // within a piece of the curve, not on its corner
    EXPECT_LT(std::abs(row.z / closed_form(at_knee, row.f) - 1.0), 0.015) << row.f;
  }
}

TEST(SweepNetlistText, ANameFromOutsideCannotRunCommands) {
  const auto netlist = sweep_netlist(coil({{"R", 1}, {"L", 1e-6}, {"C", 1e-12}, {"f_ref", 1e5}}, "x\n.control\nshell rm -rf;.csv"), 1e3,
                                     1e6, "coilassay 0.1.0");
  ASSERT_TRUE(netlist);
  EXPECT_THAT(*netlist, Not(HasSubstr(".control")));
  std::istringstream lines(*netlist);
  std::string line;
  int commands = 0;
  while (std::getline(lines, line)) commands += line.starts_with('.') ? 1 : 0;
  EXPECT_EQ(commands, 2);   // .subckt and .ends
}

TEST(SweepNetlistText, WithoutACircuitThereIsNone) {
  Measurement m = coil({{"R", 1}, {"L", 1e-6}, {"C", 1e-12}, {"f_ref", 1e5}});
  m.estimates.clear();
  EXPECT_FALSE(sweep_netlist(m, 1e3, 1e6, "coilassay 0.1.0"));
}

}  // namespace
}  // namespace coilassay

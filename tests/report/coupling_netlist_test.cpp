#include "report/coupling_netlist.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <fstream>

#include "report/advice_document.h"
#include "report/child_process.h"
#include "report/coupling_tables.h"
#include "tests/report/schema_check.h"
#include "tests/support/coupled_bench.h"

namespace coilassay {
namespace {

using testing::HasSubstr;
using testing::Not;

synthetic::CoupledWindings windings(double k) {
  synthetic::CoupledWindings w;
  w.windings = {{24e-6, 0.1, 0, 150e-12}, {60e-6, 0.3, 0, 80e-12}};
  w.coupling = {k};
  w.noise_ratio = 2e-4;
  w.first_hz = 1e4;
  return w;
}

Measurement measured(const synthetic::CoupledWindings& w, const std::string& name) {
  CouplingRequest request;
  request.propagation.exact_bench = true;
  request.ports = synthetic::simulate_ports(w).value();
  request.ports->source.name = name;
  return measure_coupling(request).value();
}

/// Columns of an AC run of a netlist: frequency, then real and imaginary part of each vector.
std::vector<std::vector<double>> run_ac(const std::string& netlist, const std::string& bench, std::size_t columns) {
  const auto ngspice = find_program("ngspice");
  EXPECT_TRUE(ngspice) << "ngspice is needed for this test";
  const Result<ScratchFolder> folder = ScratchFolder::make();
  if (!ngspice || !folder) return {};
  std::ofstream(folder->path() / "run.cir") << "windings as written\n" << netlist << bench;
  const auto run = run_child({.program = *ngspice, .arguments = {"-b", "run.cir"}, .input = "", .folder = folder->path()});
  EXPECT_TRUE(run);
  std::ifstream in(folder->path() / "out.txt");
  std::vector<std::vector<double>> rows;
  for (std::vector<double> row(columns); in >> row[0];) {
    for (std::size_t i = 1; i < columns; ++i) in >> row[i];
    rows.push_back(row);
  }
  return rows;
}

constexpr const char* kRun = ".control\nset wr_singlescale\nset numdgt=15\nac dec 5 10k 1meg\nwrdata out.txt v(p) v(s)\nquit\n.endc\n.end\n";

// What ngspice makes of the netlist against the data that were measured, noise apart.
TEST(CouplingNetlist, ASimulatorGivesTheInputDataBack) {
  for (const double k : {0.72, -0.6}) {
    const synthetic::CoupledWindings w = windings(k);
    const auto netlist = coupling_netlist(measured(w, "pair.s2p"), "coilassay 0.1.0");
    ASSERT_TRUE(netlist);
    const auto rows = run_ac(*netlist, std::string("I1 0 p ac 1\nX1 p 0 s 0 pair\nRl s 0 1e12\n") + kRun, 5);
    ASSERT_GE(rows.size(), 11u);
    for (const auto& row : rows) {
      const std::complex<double> z(row[1], row[2]), open(row[3], row[4]);
      const auto expected = synthetic::exact_impedance(w, synthetic::Connection::primary_open, row[0]);
      const auto ratio = synthetic::exact_ratio(w, 0, 1, row[0]);
      EXPECT_NEAR(std::abs(z / expected - 1.0), 0, 1e-3) << row[0];
      EXPECT_NEAR(std::abs(open / z / ratio - 1.0), 0, 1e-3) << row[0];
    }
    const auto shorted = run_ac(*netlist, std::string("I1 0 p ac 1\nX1 p 0 s 0 pair\nRl s 0 1e-6\n") + kRun, 5);
    for (const auto& row : shorted) {
      const auto expected = synthetic::exact_impedance(w, synthetic::Connection::primary_short, row[0]);
      EXPECT_NEAR(std::abs(std::complex<double>(row[1], row[2]) / expected - 1.0), 0, 2e-3) << row[0];
    }
  }
}

TEST(CouplingNetlist, HoldsThreeWindings) {
  synthetic::CoupledWindings w = windings(0.7);
  w.windings.push_back({10e-6, 0.1, 0, 0});
  w.coupling = {0.7, -0.3, -0.2};
  const auto netlist = coupling_netlist(measured(w, "three.s3p"), "coilassay 0.1.0");
  ASSERT_TRUE(netlist);
  const auto rows = run_ac(*netlist, std::string("I1 0 p ac 1\nX1 p 0 x 0 s 0 three\nRx x 0 1e12\nRl s 0 1e12\n") + kRun, 5);
  ASSERT_GE(rows.size(), 11u);
  for (const auto& row : rows) {
    const std::complex<double> ratio = std::complex<double>(row[3], row[4]) / std::complex<double>(row[1], row[2]);
    EXPECT_NEAR(std::abs(ratio / synthetic::exact_ratio(w, 0, 2, row[0]) - 1.0), 0, 2e-3) << row[0];
  }
}

TEST(CouplingNetlist, ANameFromOutsideCannotRunCommands) {
  const auto netlist = coupling_netlist(measured(windings(0.72), "x\n.control\nshell rm -rf;.s2p"), "coilassay 0.1.0");
  ASSERT_TRUE(netlist);
  EXPECT_THAT(*netlist, Not(HasSubstr(".control")));
  EXPECT_THAT(*netlist, Not(HasSubstr("shell rm")));
}

TEST(CouplingNetlist, WithoutKThereIsNone) {
  Measurement m = measured(windings(0.72), "pair.s2p");
  std::erase_if(m.estimates, [](const Estimate& e) { return e.symbol == "k"; });
  EXPECT_FALSE(coupling_netlist(m, "coilassay 0.1.0"));
}

TEST(CouplingTables, ShowInputsEquivalentsAndMatrices) {
  const auto tables = coupling_tables(measured(windings(0.72), "pair.s2p"), Script::utf8);
  ASSERT_EQ(tables.size(), 2u);
  EXPECT_EQ(tables[0].rows.size(), 5u);        // heading, Z11, Z22, Z21, Z12
  EXPECT_EQ(tables[1].rows.size(), 7u);        // heading, three elements of each circuit
  synthetic::CoupledWindings w = windings(0.7);
  w.windings.push_back({10e-6, 0.1, 0, 0});
  w.coupling = {0.7, 0.3, 0.2};
  const auto three = coupling_tables(measured(w, "three.s3p"), Script::ascii);
  ASSERT_EQ(three.size(), 4u);
  EXPECT_EQ(three[3].rows[1][1], "1.0000");
}

TEST(CouplingAdviceDocument, FollowsItsSchemaAndReadsWell) {
  const auto advice = advise_coupling({.l1_h = 100e-6, .l2_h = 400e-6, .k = 0.1, .accuracy = 0.01, .ratio_accuracy = 0.01, .wanted = 0.1});
  ASSERT_TRUE(advice);
  EXPECT_EQ(test::schema_trouble(to_json(*advice, "coilassay 0.1.0"), "advice"), "");
  const std::string text = to_text(*advice, {});
  EXPECT_THAT(text, HasSubstr("voltage ratios both ways"));
  EXPECT_THAT(text, HasSubstr("at most 0.16"));
}

}  // namespace
}  // namespace coilassay

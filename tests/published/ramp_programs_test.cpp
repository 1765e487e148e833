// Ramp against the circuit simulator ngspice: a coil whose current is a power law of its flux, a law the program does not know.
#include <gtest/gtest.h>
#include <unistd.h>

#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>

#include "analysis/ramp.h"
#include "base/random.h"
#include "tests/support/ramp_bench.h"

namespace coilassay {
namespace {

namespace fs = std::filesystem;

// i = flux/100 uH + 1 A (flux/1 mWb)^9, driven by 10 V through 50 mohm (ngspice 39, trapezoid at 100 ns: 9e-7 in flux).
// L = dflux/di = 1/(1/100 uH + 9 (flux/1 mWb)^8/1 mWb), 100 uH at zero current.
TEST(ReferenceSoftware, NgspiceSaturatingCoilAgreesInFluxAndInductance) {
  const fs::path folder = fs::temp_directory_path() / ("coilassay-ramp-" + std::to_string(::getpid()));
  fs::create_directories(folder);
  const fs::path netlist = folder / "ramp.cir", data = folder / "ramp.txt";
  std::ofstream(netlist) << "saturating coil by flux\nV1 in 0 pwl(0 0 5u 0 5.001u 10)\nRs in a 0.05\n"
                            "Bl a 0 I = v(psi)/100u + 1*pow(v(psi)/1m,9)\nGp 0 psi a 0 1\nCp psi 0 1 ic=0\nRpsi psi 0 1e15\n"
                            ".options reltol=1e-6 abstol=1e-12 vntol=1e-15\n"
                            ".control\nset wr_singlescale\nset numdgt=15\ntran 100n 135u 0 100n uic\nlinearize v(a) i(V1) v(psi)\nwrdata "
                         << data.string() << " v(a) i(V1) v(psi)\nquit\n.endc\n.end\n";
  [[maybe_unused]] const int status = std::system(("ngspice -b " + netlist.string() + " > /dev/null 2>&1").c_str());
  std::ifstream in(data);
  ASSERT_TRUE(in) << "ngspice is needed for this test";
  Capture capture;
  capture.source.name = "ngspice";
  capture.channels.resize(2);
  std::vector<double> flux;
  double t = 0, v = 0, i = 0, psi = 0;
  Random noise(3);
  while (in >> t >> v >> i >> psi) {
    capture.channels[0].samples.push_back(v);
    // A thousandth of the peak as noise: a fit needs some to weigh by.
    capture.channels[1].samples.push_back(-i + 0.02 * noise.normal());
    flux.push_back(psi);
  }
  fs::remove_all(folder);
  ASSERT_GT(flux.size(), 1000U);
  capture.time = {0, 100e-9, {}};
  capture.channels[0].name = "v(a)";
  capture.channels[0].unit = Unit::volt;
  capture.channels[1].name = "i";
  capture.channels[1].unit = Unit::ampere;
  for (Channel& channel : capture.channels) channel.unit_stated = true;

  RampRequest request;
  request.propagation.exact_bench = true;
  request.bench.winding_resistance = StatedValue::exact(0, Unit::ohm);   // v(a) is over the ideal coil
  const Measurement m = test::measured(capture, request);
  ASSERT_NE(m.find("L_0"), nullptr);
  EXPECT_TRUE(test::covers(*m.find("L_0"), 100e-6));
  const auto inductance = [](double x) { return 1 / (1 / 100e-6 + 9 * std::pow(x / 1e-3, 8) / 1e-3); };
  const auto current = [](double x) { return x / 100e-6 + std::pow(x / 1e-3, 9); };
  // L = 0.7 L_0: 9 (x/1m)^8 = 1m/100u (1/0.7 - 1).
  const double x30 = 1e-3 * std::pow(10.0 / 9 * (1 / 0.7 - 1), 1.0 / 8);
  const Estimate* knee = m.find("I_sat_30");
  ASSERT_NE(knee, nullptr);
  EXPECT_TRUE(test::covers(*knee, current(x30))) << knee->low << " " << current(x30) << " " << knee->high;
  const Table* curve = nullptr;
  for (const Table& table : m.tables) {
    if (table.name == "curve") curve = &table;
  }
  ASSERT_NE(curve, nullptr);
  int inside = 0, flux_inside = 0;
  const auto rows = curve->columns[0].values.size();
  for (std::size_t k = 0; k < rows; ++k) {
    const double at = curve->columns[0].values[k];
    double x = at * 100e-6;
    for (int n = 0; n < 60; ++n) x -= (current(x) - at) * inductance(x) * 0.9;
    inside += std::fabs(curve->columns[1].values[k] - inductance(x)) <= curve->columns[2].values[k] ? 1 : 0;
    // Flux within what the inductance is uncertain by.
    flux_inside += std::fabs(curve->columns[4].values[k] - x) <= curve->columns[2].values[k] * at + 1e-6 * x + 1e-9 ? 1 : 0;
  }
  EXPECT_GE(inside, static_cast<int>(0.9 * static_cast<double>(rows)));
  EXPECT_GE(flux_inside, static_cast<int>(0.9 * static_cast<double>(rows)));
}

}  // namespace
}  // namespace coilassay

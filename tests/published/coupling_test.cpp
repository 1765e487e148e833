// Coupling against published values, the circuit simulator ngspice, and a million trials.
#include <gtest/gtest.h>
#include <unistd.h>

#include <cmath>
#include <complex>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <numbers>

#include "analysis/coupling.h"
#include "base/random.h"

namespace coilassay {
namespace {

namespace fs = std::filesystem;
using enum CouplingItem;
using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;

CouplingInput exact(CouplingItem item, double value) {
  return {item, CouplingValue{StatedValue::rectangular(value, 1e-4 * std::fabs(value), is_ratio(item) ? Unit::one : Unit::henry), std::nullopt}};
}

Measurement measured(std::vector<CouplingInput> inputs) {
  CouplingRequest request;
  request.propagation.exact_bench = true;
  request.inputs = std::move(inputs);
  return measure_coupling(request).value();
}

// Textbook identities, exact by algebra: k = sqrt(1 - L_short/L_open), M = (L_aiding - L_opposing)/4.
TEST(CouplingMethods, OpenShortAndSeriesGiveTheTextbookValues) {
  const Measurement open_short = measured({exact(primary_open, 100e-6), exact(secondary_open, 400e-6), exact(primary_short, 19e-6)});
  EXPECT_NEAR(open_short.find("k")->quantity.value, 0.9, 1e-9);
  EXPECT_NEAR(open_short.find("M")->quantity.value, 180e-6, 1e-13);
  const Measurement series = measured({exact(primary_open, 100e-6), exact(secondary_open, 400e-6), exact(aiding, 860e-6), exact(opposing, 140e-6)});
  EXPECT_NEAR(series.find("M")->quantity.value, 180e-6, 1e-13);
}

struct Circles {
  double radius1_m, radius2_m, distance_m, m_h;
};

// Coaxial circular filaments (Maxwell's elliptic integrals). The first is the worked example of F. W. Grover, Inductance Calculations (1946),
// ch. 11, 248.79 nH, FROM MEMORY, verified by computing; the others COMPUTED with the same formula in another program.
constexpr Circles kCircles[] = {{0.25, 0.2, 0.1, 2.487873590e-07},   {0.25, 0.25, 0.01, 1.036664849e-06}, {0.25, 0.25, 0.04, 6.060676284e-07},
                                {0.25, 0.25, 0.1, 3.376847185e-07},  {0.25, 0.25, 0.5, 3.546498155e-08},  {0.1, 0.1, 0.1, 4.940784631e-08},
                                {0.25, 0.1, 0, 8.423128487e-08},     {0.1, 0.01, 0.05, 1.412402328e-09},  {0.05, 0.05, 1, 1.224519498e-11},
                                {0.03, 0.02, 0.005, 2.959493866e-08}};

/// External inductance of a ring of round wire: mu0 r (ln(8 r/a) - 2), a wire of 0.2 mm.
double ring(double radius_m) { return 4e-7 * std::numbers::pi * radius_m * (std::log(8 * radius_m / 0.2e-3) - 2); }

TEST(CouplingMethods, CoaxialCirclesAsTwoPortDataGiveTheirMBack) {
  for (const Circles& c : kCircles) {
    const double l1 = ring(c.radius1_m), l2 = ring(c.radius2_m);
    Sweep sweep;
    sweep.source.name = "circles";
    sweep.ports = 2;
    sweep.as_read = "Z";
    for (int i = 0; i < 31; ++i) {
      const double f = 1e5 * std::pow(10, i / 15.0), omega = kTwoPi * f;
      sweep.frequency_hz.push_back(f);
      sweep.z_ohm.push_back({Complex(0.01, omega * l1), Complex(0, omega * c.m_h), Complex(0, omega * c.m_h), Complex(0.01, omega * l2)});
    }
    sweep.bad.assign(31, false);
    CouplingRequest request;
    request.propagation.exact_bench = true;
    request.ports = sweep;
    const Measurement m = measure_coupling(request).value();
    ASSERT_NE(m.find("M"), nullptr) << c.distance_m;
    EXPECT_NEAR(m.find("M")->quantity.value, c.m_h, 1e-6 * c.m_h) << c.distance_m;
    EXPECT_NEAR(m.find("k")->quantity.value, c.m_h / std::sqrt(l1 * l2), 1e-6) << c.distance_m;
  }
}

/// Impedance of the driven winding and voltage of the other from ngspice, the other closed by `load`.
struct Seen {
  std::vector<double> f;
  std::vector<Complex> z, across;
};
Seen run_ngspice(const std::string& load, bool drive_second) {
  const fs::path folder = fs::temp_directory_path() / ("coilassay-coupling-" + std::to_string(::getpid()) + (drive_second ? "b" : "a"));
  fs::create_directories(folder);
  const fs::path netlist = folder / "pair.cir", data = folder / "pair.txt";
  // Windings of 100 uH, 0.1 ohm and 400 uH, 0.2 ohm, k 0.95.
  std::ofstream(netlist) << "coupled pair\nI1 0 " << (drive_second ? "s" : "p") << " ac 1\nR1 p p1 0.1\nL1 p1 0 100u\nL2 s1 0 400u\nR2 s1 s 0.2\nK12 L1 L2 0.95\nRl "
                         << (drive_second ? "p" : "s") << " 0 " << load
                         << "\n.control\nset wr_singlescale\nset numdgt=15\nac dec 10 100 100k\nwrdata " << data.string() << " v(p) v(s)\nquit\n.endc\n.end\n";
  [[maybe_unused]] const int status = std::system(("ngspice -b " + netlist.string() + " > /dev/null 2>&1").c_str());
  Seen seen;
  std::ifstream in(data);
  double f = 0, pr = 0, pi = 0, sr = 0, si = 0;
  while (in >> f >> pr >> pi >> sr >> si) {
    seen.f.push_back(f);
    seen.z.push_back(drive_second ? Complex(sr, si) : Complex(pr, pi));
    seen.across.push_back(drive_second ? Complex(pr, pi) : Complex(sr, si));
  }
  fs::remove_all(folder);
  return seen;
}

Sweep one_port(const Seen& seen) {
  Sweep sweep;
  sweep.source.name = "ngspice";
  sweep.ports = 1;
  sweep.frequency_hz = seen.f;
  for (const Complex z : seen.z) sweep.z_ohm.push_back({z});
  sweep.bad.assign(seen.f.size(), false);
  return sweep;
}

// From 100 Hz on, where wL_2 is 1.3 times R_2 and the short is none: the joint solution knows.
TEST(ReferenceSoftware, NgspiceCoupledPairOpenedAndShorted) {
  const Seen open = run_ngspice("1e12", false), shorted = run_ngspice("1e-9", false), second = run_ngspice("1e12", true);
  ASSERT_GT(open.f.size(), 20u) << "ngspice is needed for this test";
  CouplingRequest request;
  request.propagation.exact_bench = true;
  request.inputs = {{primary_open, one_port(open)}, {primary_short, one_port(shorted)}, {secondary_open, one_port(second)}};
  const Measurement m = measure_coupling(request).value();
  EXPECT_NEAR(m.find("L_1")->quantity.value, 100e-6, 1e-6 * 100e-6);
  EXPECT_NEAR(m.find("L_2")->quantity.value, 400e-6, 1e-6 * 400e-6);
  EXPECT_NEAR(m.find("k")->quantity.value, 0.95, 1e-6);
  EXPECT_NEAR(m.model->parameters.at("R_2").value, 0.2, 1e-5);

  // One frequency, where the resistance of the secondary matters, from values a meter would show.
  std::size_t i = 0;
  while (open.f[i] < 990) ++i;
  const double omega = kTwoPi * open.f[i];
  const auto read = [&](CouplingItem item, const Seen& seen) {
    const double value = seen.z[i].imag() / omega;
    return CouplingInput{item, CouplingValue{StatedValue::rectangular(value, 1e-4 * value, Unit::henry), open.f[i]}};
  };
  CouplingRequest values;
  values.propagation.exact_bench = true;
  values.inputs = {read(primary_open, open), read(primary_short, shorted), read(secondary_open, second)};
  values.winding_resistance_1 = StatedValue::exact(0.1, Unit::ohm);
  values.winding_resistance_2 = StatedValue::exact(0.2, Unit::ohm);
  const Measurement at = measure_coupling(values).value();
  EXPECT_NEAR(at.find("k")->quantity.value, 0.95, 1e-5);
  values.winding_resistance_1.reset();
  values.winding_resistance_2.reset();
  EXPECT_GT(std::fabs(measure_coupling(values).value().find("k")->quantity.value - 0.95), 1e-4);
}

// The straight line through the formula k = sqrt(1 - Ls/Lo), M = k sqrt(Lo L2), against a million draws of it.
TEST(CouplingMethods, FirstOrderAgreesWithAMillionTrials) {
  const double tolerance = 0.01;
  const Measurement m = [&] {
    CouplingRequest request;
    request.propagation.exact_bench = true;
    for (const auto& [item, value] : {std::pair{primary_open, 100e-6}, std::pair{primary_short, 19e-6}, std::pair{secondary_open, 400e-6}}) {
      request.inputs.push_back({item, CouplingValue{StatedValue::rectangular(value, tolerance * value, Unit::henry), std::nullopt}});
    }
    return measure_coupling(request).value();
  }();
  Random random(5);
  constexpr int kTrials = 1'000'000;
  double sums[3][2] = {};
  int inside = 0;
  for (int i = 0; i < kTrials; ++i) {
    const auto draw = [&](double value) { return value * (1 + random.uniform(-tolerance, tolerance)); };
    const double lo = draw(100e-6), ls = draw(19e-6), l2 = draw(400e-6);
    const double k = std::sqrt(1 - ls / lo), values[] = {k, k * std::sqrt(lo * l2), l2 * ls / lo};
    for (int v = 0; v < 3; ++v) sums[v][0] += values[v] / kTrials, sums[v][1] += values[v] * values[v] / kTrials;
    inside += m.find("k")->low <= k && k <= m.find("k")->high ? 1 : 0;
  }
  const char* symbols[] = {"k", "M", "L_leak_2"};
  for (int v = 0; v < 3; ++v) {
    const double deviation = std::sqrt(sums[v][1] - sums[v][0] * sums[v][0]);
    // A million draws know a deviation to 0.1 %; the slopes are off by the square of 1 %.
    EXPECT_NEAR(m.find(symbols[v])->quantity.standard_uncertainty, deviation, 0.005 * deviation) << symbols[v];
  }
  EXPECT_NEAR(static_cast<double>(inside) / kTrials, 0.95, 0.003);
}

}  // namespace
}  // namespace coilassay

#include "acquire/synthetic/coupled_windings.h"

#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <numbers>
#include <sstream>

#include "acquire/port_writer.h"
#include "acquire/reader.h"
#include "tests/support/program.h"

namespace coilassay::synthetic {
namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;

CoupledWindings pair_of_windings() {
  CoupledWindings w;
  w.windings = {{100e-6, 0.1, 0, 0}, {400e-6, 0.2, 0, 0}};
  w.coupling = {0.95};
  return w;
}

// Lsc(w) = L1 - w^2 M^2 (L2 + Ll)/((R2 + Rl)^2 + w^2 (L2 + Ll)^2), from Kirchhoff's laws by hand.
TEST(CoupledWindings, AShortThroughALinkReadsWhatTheClosedFormSays) {
  CoupledWindings w = pair_of_windings();
  w.link_h = 30e-9;
  w.link_ohm = 0.05;
  const double m = 0.95 * 200e-6;
  for (const double f : {100.0, 1e3, 1e5}) {
    const double omega = kTwoPi * f, l2 = 400e-6 + 30e-9, r2 = 0.25;
    const double expected = 100e-6 - omega * omega * m * m * l2 / (r2 * r2 + omega * omega * l2 * l2);
    EXPECT_NEAR(exact_impedance(w, Connection::primary_short, f).imag() / omega, expected, 1e-12 * 100e-6) << f;
  }
}

TEST(CoupledWindings, SeriesAndRatiosFollowFromTheInductances) {
  const CoupledWindings w = pair_of_windings();
  const double f = 1e6, omega = kTwoPi * f;
  EXPECT_NEAR(exact_impedance(w, Connection::aiding, f).imag() / omega, 880e-6, 1e-12);
  EXPECT_NEAR(exact_impedance(w, Connection::opposing, f).imag() / omega, 120e-6, 1e-12);
  EXPECT_NEAR(std::abs(exact_ratio(w, 0, 1, f)), 1.9, 1e-6);
  EXPECT_NEAR(std::abs(exact_ratio(w, 1, 0, f)), 0.475, 1e-6);
}

TEST(CoupledWindings, AWindingsCapacitanceMakesItResonate) {
  CoupledWindings w = pair_of_windings();
  w.windings[0].capacitance_f = 100e-12;
  const double f = 0.1 / (kTwoPi * std::sqrt(100e-6 * 100e-12));   // a tenth of the resonance: 1 % more
  EXPECT_NEAR(exact_impedance(w, Connection::primary_open, f).imag() / (kTwoPi * f), 100e-6 / 0.99, 1e-10);
}

TEST(CoupledWindings, ExchangedLeadsExchangeTheTruth) {
  CoupledWindings w = pair_of_windings();
  w.swapped_ports = true;
  const auto truth = coupled_truth(w);
  ASSERT_TRUE(truth);
  EXPECT_EQ(truth->l1_h, 400e-6);
  const auto ports = simulate_ports(w);
  ASSERT_TRUE(ports);
  EXPECT_NEAR(ports->z_ohm[0][0].imag() / (kTwoPi * 1e3), 400e-6, 1e-9);
}

TEST(CoupledWindings, RefuseWhatCannotBe) {
  CoupledWindings w = pair_of_windings();
  w.coupling = {1.0};
  EXPECT_FALSE(coupled_truth(w));
  w.windings.push_back({});
  w.coupling = {0.9, 0.9, -0.9};   // two windings near a third cannot oppose each other
  EXPECT_FALSE(coupled_truth(w));
  w.coupling = {0.9, 0.9, 0.9};
  EXPECT_TRUE(coupled_truth(w));
  w.windings[1].inductance_h = -1;
  EXPECT_FALSE(coupled_truth(w));
}

TEST(PortWriter, MatricesComeBackBitForBit) {
  const test::TemporaryFolder folder;
  for (const std::size_t n : {2u, 3u}) {
    CoupledWindings w = pair_of_windings();
    if (n == 3) w.windings.push_back({50e-6, 0.1, 0, 0}), w.coupling = {0.9, 0.4, 0.2};
    w.noise_ratio = 0.01;
    w.not_reciprocal = 0.02;
    const auto sweep = simulate_ports(w);
    ASSERT_TRUE(sweep);
    std::ostringstream text;
    write_touchstone_impedance(text, *sweep, "made up");
    const std::string file = folder.file("w.s" + std::to_string(n) + "p", text.str());
    const auto read = read_recording(file);
    ASSERT_TRUE(read) << read.error().finding;
    const Sweep& back = std::get<Sweep>(*read);
    ASSERT_EQ(back.ports, n);
    EXPECT_EQ(back.frequency_hz, sweep->frequency_hz);
    EXPECT_EQ(back.z_ohm, sweep->z_ohm);
  }
}

}  // namespace
}  // namespace coilassay::synthetic

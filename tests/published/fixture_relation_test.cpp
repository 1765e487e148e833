// The relations of open, short and load at the limits where their answer is known without them, and against fixtures that are
// written down as chains of matrices. Open/short/load: "Zx = Zstd (Zo - Zsm)(Zm - Zs)/((Zsm - Zs)(Zo - Zm))", from memory; its
// three limits and the chains are what verifies it.
#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <complex>
#include <numbers>

#include "analysis/fixture_relation.h"
#include "base/random.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;
using Chain = std::array<Complex, 4>;   // v1 = a v2 + b i2, i1 = c v2 + d i2

Complex seen_through(const Chain& f, Complex z) { return (f[0] * z + f[1]) / (f[2] * z + f[3]); }
Complex seen_open(const Chain& f) { return f[0] / f[2]; }

Chain random_chain(Random& random) {
  Chain f;
  for (Complex& x : f) x = {random.normal(), random.normal()};
  f[0] += 3.0;
  f[3] += 3.0;
  return f;
}

FixtureStandards standards_of(const Chain& f, Complex short_ohm, Complex load_ohm, bool with_load) {
  FixtureStandards s;
  s.open = seen_open(f);
  s.short_circuit = seen_through(f, short_ohm);
  s.short_ohm = short_ohm;
  if (with_load) {
    s.load = seen_through(f, load_ohm);
    s.load_ohm = load_ohm;
  }
  return s;
}

void expect_close(Complex a, Complex b, double relative = 1e-9) { EXPECT_LT(std::abs(a - b), relative * std::abs(b)) << a << " " << b; }

TEST(FixtureRelation, OpenShortLoadGivesTheLoadTheShortAndTheOpenBack) {
  Random random(1);
  for (int n = 0; n < 50; ++n) {
    const FixtureStandards s = standards_of(random_chain(random), 0.0, {100, 3}, true);
    expect_close(behind_fixture(*s.load, s), s.load_ohm);                       // Zm = load
    EXPECT_LT(std::abs(behind_fixture(s.short_circuit, s)), 1e-9);              // Zm = short
    EXPECT_GT(std::abs(behind_fixture(s.open * (1 + 1e-12), s)), 1e6);          // Zm = open
    // As the formula is quoted.
    const Complex zm(12, 34);
    expect_close(behind_fixture(zm, s),
                 s.load_ohm * (s.open - *s.load) * (zm - s.short_circuit) / ((*s.load - s.short_circuit) * (s.open - zm)));
  }
}

TEST(FixtureRelation, OpenShortLoadTakesAnyLinearFixtureOut) {
  Random random(2);
  for (int n = 0; n < 100; ++n) {
    const Chain f = random_chain(random);
    const Complex part(random.uniform(0, 20), random.uniform(-500, 500));
    const FixtureStandards s = standards_of(f, {1e-3, 0.25}, {99.8, 1.5}, true);
    expect_close(behind_fixture(seen_through(f, part), s), part, 1e-8);
  }
}

TEST(FixtureRelation, OpenAndShortTakeASeriesAndAParallelPartOut) {
  Random random(3);
  for (int n = 0; n < 100; ++n) {
    // Zf in series, then Yf across: v1 = v2 (1 + Zf Yf) + Zf i2, i1 = Yf v2 + i2.
    const Complex zf(random.uniform(0, 1), random.uniform(0, 60)), yf(0, random.uniform(1e-6, 1e-3));
    const Chain f = {1.0 + zf * yf, zf, yf, 1.0};
    const Complex part(random.uniform(0, 20), random.uniform(-500, 500));
    for (const Complex short_ohm : {Complex(0), Complex(2e-3, 2.5)}) {
      const FixtureStandards s = standards_of(f, short_ohm, 0, false);
      expect_close(behind_fixture(seen_through(f, part), s), part);
      EXPECT_LT(std::abs(behind_fixture(s.short_circuit, s) - short_ohm), 1e-9);
    }
    // With a short that is one, as the relation is quoted: (Zm - Zs)/(1 - (Zm - Zs) Yo).
    const FixtureStandards s = standards_of(f, 0, 0, false);
    const Complex difference = seen_through(f, part) - s.short_circuit;
    expect_close(behind_fixture(seen_through(f, part), s), difference / (1.0 - difference / (s.open - s.short_circuit)));
  }
}

TEST(FixtureRelation, AnOpenWithItsOwnCapacitanceIsNotTakenForTheFixture) {
  const Complex zf(0.1, 6), yf(0, 1e-4), own(0, 3e-5), part(5, 300);
  const Chain f = {1.0 + zf * yf, zf, yf, 1.0};
  for (const bool with_load : {false, true}) {
    FixtureStandards s = standards_of(f, {0, 0.5}, 100, with_load);
    s.open = seen_through(f, 1.0 / own);
    s.open_siemens = own;
    expect_close(behind_fixture(seen_through(f, part), s), part);
  }
}

// needs of the trade: 0.4 nH of a short on a part of 10 nH are 4 %.
TEST(FixtureRelation, TheShortsOwnInductanceIsGivenBackToThePart) {
  const double w = 2 * std::numbers::pi * 100e6;
  const Complex own(0, w * 0.4e-9), part(0, w * 10e-9), leads(0.1, w * 5e-9);
  FixtureStandards s{1e6, leads + own, std::nullopt, own, 0, 0};
  EXPECT_NEAR(behind_fixture(leads + part, s).imag() / w, 10e-9, 2e-14);      // an open of 1 Mohm
  s.short_ohm = 0;
  EXPECT_NEAR(behind_fixture(leads + part, s).imag() / (w * 10e-9), 0.96, 1e-4);
}

TEST(FixtureRelation, ATwoPortAndALineAreTakenOut) {
  // A series resistor of 10 ohm between 50 ohm ports: S11 = 10/110, S21 = 100/110.
  const TwoPort pad{10.0 / 110, 100.0 / 110, 100.0 / 110, 10.0 / 110, 50, 50};
  const Complex part(3, 77);
  expect_close(behind_two_port(part + 10.0, pad), part);
  // A line of an eighth of a wave turns an impedance as tan(pi/4) = 1 says: Z0 (Z + j Z0)/(Z0 + j Z).
  const double w = 2 * std::numbers::pi * 1e9, delay = 1.0 / 8 / 1e9;
  const Complex j(0, 1), measured = 50.0 * (part + j * 50.0) / (50.0 + j * part);
  expect_close(behind_line(measured, w, delay, 50), part);
}

}  // namespace
}  // namespace coilassay

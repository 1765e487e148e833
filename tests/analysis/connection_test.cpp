// One impedance out of the ports: S of known networks written down by their own formulas.
#include "analysis/connection.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

#include "analysis/interpolation.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;

Complex part_at(double f) { return {2, kTwoPi * f * 10e-6}; }

Sweep sweep_of(std::vector<double> references) {
  Sweep s;
  s.source.name = "made.s2p";
  s.ports = references.size();
  s.reference_ohm = std::move(references);
  s.as_read = "S";
  return s;
}

void add(Sweep& s, double f, std::vector<Complex> scattering) {
  s.frequency_hz.push_back(f);
  s.z_ohm.push_back(std::vector<Complex>(s.ports * s.ports, std::nan("")));
  s.bad.push_back(true);   // as the reader marks a two-port without an impedance matrix
  s.scattering.push_back(std::move(scattering));
}

/// Of a chain matrix, by the textbook.
std::vector<Complex> scattering_of(const std::vector<Complex>& chain, double r1, double r2) {
  const Complex a = chain[0], b = chain[1], c = chain[2], d = chain[3];
  const Complex n = a * r2 + b + c * r1 * r2 + d * r1;
  const double root = std::sqrt(r1 * r2);
  return {(a * r2 + b - c * r1 * r2 - d * r1) / n, 2.0 * (a * d - b * c) * root / n, 2.0 * root / n, (-a * r2 + b - c * r1 * r2 + d * r1) / n};
}

std::vector<Complex> product(const std::vector<Complex>& x, const std::vector<Complex>& y) {
  return {x[0] * y[0] + x[1] * y[2], x[0] * y[1] + x[1] * y[3], x[2] * y[0] + x[3] * y[2], x[2] * y[1] + x[3] * y[3]};
}

std::vector<Complex> in_series(Complex z) { return {1, z, 0, 1}; }
std::vector<Complex> across(Complex z) { return {1, 0, 1.0 / z, 1}; }

const std::vector<double> kGrid = {100e3, 200e3, 400e3, 800e3, 1600e3};

TEST(Connection, SeriesAndShuntFromTwoPortsOfAnyReference) {
  for (const auto& [r1, r2] : {std::pair{50.0, 50.0}, std::pair{50.0, 75.0}}) {
    Sweep series = sweep_of({r1, r2}), shunt = sweep_of({r1, r2});
    for (const double f : kGrid) {
      add(series, f, scattering_of(in_series(part_at(f)), r1, r2));
      add(shunt, f, scattering_of(across(part_at(f)), r1, r2));
    }
    const auto a = one_port_of(series, {.connection = Connection::series, .port = {}, .at_port_1 = {}, .at_port_2 = {}});
    const auto b = one_port_of(shunt, {.connection = Connection::shunt, .port = {}, .at_port_1 = {}, .at_port_2 = {}});
    ASSERT_TRUE(a && b);
    for (std::size_t i = 0; i < kGrid.size(); ++i) {
      EXPECT_LT(std::abs(a->z_ohm[i][0] - part_at(kGrid[i])), 1e-11 * std::abs(part_at(kGrid[i])));
      EXPECT_LT(std::abs(b->z_ohm[i][0] - part_at(kGrid[i])), 1e-11 * std::abs(part_at(kGrid[i])));
      EXPECT_FALSE(a->bad[i]);
      // What the reference promises: |dZ/dS21| = |Z + R|²/R.
      const Complex z = part_at(kGrid[i]);
      const Complex s = scattering_of(in_series(z), r1, r2)[2], moved = scattering_of(in_series(z * (1 + 1e-6)), r1, r2)[2];
      EXPECT_NEAR(std::abs(z * 1e-6 / (moved - s)) * 2 * std::sqrt(r1 * r2) / std::norm(z + r1 + r2), 1, 1e-4);
    }
    EXPECT_EQ(a->reference_ohm.front(), r1 + r2);
  }
}

TEST(Connection, TwoPortsOnBothSidesAreTakenOut) {
  Sweep measured = sweep_of({50, 50}), left = sweep_of({50, 50}), right = sweep_of({50, 50});
  for (const double f : kGrid) {
    // Unlike on purpose, and not symmetric: leads with a stray at one end.
    const auto l = product(in_series({0.1, kTwoPi * f * 30e-9}), across({0, -1 / (kTwoPi * f * 3e-12)}));
    const auto r = product(across({0, -1 / (kTwoPi * f * 5e-12)}), in_series({0.3, kTwoPi * f * 50e-9}));
    add(measured, f, scattering_of(product(product(l, in_series(part_at(f))), r), 50, 50));
    add(left, f, scattering_of(l, 50, 50));
    // Its file begins at the analyser: the same network turned round.
    const auto s = scattering_of(r, 50, 50);
    add(right, f, {s[3], s[1], s[2], s[0]});
  }
  const auto out = one_port_of(measured, {.connection = Connection::series, .port = {}, .at_port_1 = left, .at_port_2 = right});
  ASSERT_TRUE(out) << out.error().finding;
  for (std::size_t i = 0; i < kGrid.size(); ++i) {
    EXPECT_LT(std::abs(out->z_ohm[i][0] - part_at(kGrid[i])), 1e-9 * std::abs(part_at(kGrid[i])));
  }
  Sweep narrow = left;
  narrow.frequency_hz.back() = 1000e3;
  const auto refused = one_port_of(measured, {.connection = Connection::series, .port = {}, .at_port_1 = narrow, .at_port_2 = {}});
  ASSERT_FALSE(refused);
  EXPECT_EQ(refused.error().place, "--remove-port1");
}

TEST(Connection, AReflectionIsThatOfThePortThatWasNamed) {
  Sweep s = sweep_of({50, 75});
  add(s, 1e6, {0.2, 0.1, 0.1, Complex(0, 0.5)});
  const auto second = one_port_of(s, {.connection = Connection::reflect, .port = 2, .at_port_1 = {}, .at_port_2 = {}});
  ASSERT_TRUE(second);
  EXPECT_LT(std::abs(second->z_ohm[0][0] - 75.0 * Complex(1, 0.5) / Complex(1, -0.5)), 1e-12);
  EXPECT_EQ(one_port_of(s, {}).error().problem, Problem::usage);   // which port is not said
  EXPECT_EQ(one_port_of(s, {.connection = Connection::reflect, .port = 3, .at_port_1 = {}, .at_port_2 = {}}).error().place, "--port");
  Sweep one = sweep_of({50});
  add(one, 1e6, {0.2});
  EXPECT_EQ(one_port_of(one, {.connection = Connection::series, .port = {}, .at_port_1 = {}, .at_port_2 = {}}).error().place, "--connection");
}

TEST(Interpolation, IsExactForCubicsAndKeepsThePointsOfTheGrid) {
  const std::vector<double> grid = {1, 2, 4, 7, 11, 16};
  std::vector<Complex> values;
  const auto cubic = [](double f) { return Complex(1 - f + 0.1 * f * f * f, 2 * f * f); };
  for (const double f : grid) values.push_back(cubic(f));
  for (const double f : {1.0, 1.3, 2.0, 3.0, 6.9, 12.0, 16.0}) {
    EXPECT_LT(std::abs(at_place(values, place_in_grid(grid, f)) - cubic(f)), 1e-10) << f;
  }
  EXPECT_NEAR(at_place(values, place_in_grid(grid, 3), true).real(), (cubic(2).real() + cubic(4).real()) / 2, 1e-12);
  EXPECT_TRUE(covers(grid, 1, 16));
  EXPECT_FALSE(covers(grid, 0.99, 5));
  EXPECT_FALSE(covers(grid, 2, 16.1));
}

}  // namespace
}  // namespace coilassay

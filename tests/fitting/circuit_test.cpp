#include "fitting/circuit.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

namespace coilassay {
namespace {

using Complex = std::complex<double>;
using P = CircuitParameter;
const Complex j(0, 1);

Circuit full_circuit() {
  Circuit c;
  c.family = {.parallel_loss = true, .skin = true, .relaxation = true, .second_resonance = true};
  c.reference_hz = 2e5;
  c.values = {0.4, 47e-6, 12e-12, 1 / 30e3, 0.3, 0.8, 0.2, 5e-12, 9e6, 0.04};
  return c;
}

/// The elements put together one by one, as a circuit diagram is read.
Complex by_hand(const Circuit& c, double f) {
  const Complex s = j * 2.0 * std::numbers::pi * f;
  const double w_ref = 2 * std::numbers::pi * c.reference_hz, l = c[P::inductance], k = c[P::relaxation_share];
  const double tau = c[P::relaxation_resistance] / (k * l * w_ref * w_ref), eddy = k * l / tau;
  const Complex neighbour = 1.0 / (1.0 / (s * k * l) + 1.0 / eddy);   // a part of L with a resistance across it
  const Complex series = c[P::series_resistance] + s * (1 - k) * l + neighbour + (1.0 + j) * c[P::skin_resistance] * std::sqrt(f / c.reference_hz);
  const double w_2 = 2 * std::numbers::pi * c[P::second_frequency], l_2 = 1 / (w_2 * w_2 * c[P::second_capacitance]);
  const Complex tank = s * l_2 + c[P::second_damping] * w_2 * l_2 + 1.0 / (s * c[P::second_capacitance]);
  return 1.0 / (1.0 / series + s * c[P::capacitance] + c[P::parallel_conductance] + 1.0 / tank);
}

TEST(Circuit, IsTheOneThatIsDrawn) {
  const Circuit c = full_circuit();
  for (double f = 1e3; f < 1e8; f *= 1.7) {
    EXPECT_LT(std::abs(impedance(c, f) / by_hand(c, f) - 1.0), 1e-12) << f;   // rounding near the resonances
  }
}

TEST(Circuit, SlopesAreThoseOfSmallSteps) {
  const Circuit c = full_circuit();
  const auto order = parameters_of(c.family);
  ASSERT_EQ(order.size(), kCircuitParameters);
  const double h = 1e-5;
  for (const double f : {2e3, 3e5, 5.9e6, 8.9e6, 9.3e6, 4e7}) {
    const ImpedanceSlopes at = impedance_slopes(c, f);
    for (std::size_t i = 0; i < order.size(); ++i) {
      Circuit up = c, down = c;
      up[order[i]] *= 1 + h;
      down[order[i]] *= 1 - h;
      const Complex step = (by_hand(up, f) - by_hand(down, f)) / (2 * h * c[order[i]]);
      // Central differences err by h^2 of the third derivative: near a resonance of Q 25 by some 1e-6, and by rounding.
      EXPECT_LT(std::abs(at.by_parameter[i] - step), 3e-6 * std::abs(step) + 1e-9 * std::abs(at.z) / c[order[i]]) << name(order[i]) << " " << f;
    }
    const Complex step = (by_hand(c, f * (1 + h)) - by_hand(c, f * (1 - h))) / (2 * h * f);
    EXPECT_LT(std::abs(at.by_frequency - step), 1e-5 * std::abs(step)) << f;
  }
}

// Textbook identity (parallel self-resonance): apparent L(f) = L/(1 - (f/f0)^2); at f0/10 1.010101 L, at f0/2 1.333333 L.
TEST(Circuit, ApparentInductanceRisesTowardsTheResonance) {
  Circuit c;
  c.values = {0, 100e-6, 25e-12};
  const double f_0 = 1 / (2 * std::numbers::pi * std::sqrt(100e-6 * 25e-12));
  for (const auto& [share, factor] : {std::pair{0.1, 1.010101}, {0.5, 1.333333}}) {
    const double f = share * f_0;
    EXPECT_NEAR(impedance(c, f).imag() / (2 * std::numbers::pi * f) / 100e-6, factor, 1e-6);
  }
}

TEST(Circuit, ResonanceIsTheLowestFallingZero) {
  Circuit c;
  c.values = {1, 100e-6, 25e-12};
  // Im Y = 0 of R + jwL across C: w^2 = 1/LC - (R/L)^2.
  const double w = std::sqrt(1 / (100e-6 * 25e-12) - 1e8);
  ASSERT_TRUE(falling_zero_hz(c, 1e3, 1e8));
  EXPECT_NEAR(*falling_zero_hz(c, 1e3, 1e8) / (w / (2 * std::numbers::pi)), 1, 1e-12);
  EXPECT_FALSE(falling_zero_hz(c, 1e3, 1e6));
  EXPECT_FALSE(falling_zero_hz(c, 1e7, 1e8));
  // A second tank adds a rising zero at f_2 and a falling one above it; the first is pulled down.
  Circuit two = full_circuit();
  const auto first = falling_zero_hz(two, 1e3, 1e8);
  ASSERT_TRUE(first);
  EXPECT_LT(*first, two[P::second_frequency]);
  EXPECT_TRUE(falling_zero_hz(two, two[P::second_frequency], 1e8));
}

TEST(Circuit, ResonanceMovesWithItsParameters) {
  const Circuit c = full_circuit();
  const double zero = *falling_zero_hz(c, 1e3, 1e8);
  const auto slopes = falling_zero_slopes(c, zero);
  const auto order = parameters_of(c.family);
  for (std::size_t i = 0; i < order.size(); ++i) {
    Circuit up = c, down = c;
    up[order[i]] *= 1.001;
    down[order[i]] *= 0.999;
    const double step = (*falling_zero_hz(up, 1e3, 1e8) - *falling_zero_hz(down, 1e3, 1e8)) / (0.002 * c[order[i]]);
    EXPECT_NEAR(slopes[i], step, 1e-3 * std::fabs(step) + 1e-9 * zero / c[order[i]]) << name(order[i]);
  }
}

TEST(Circuit, FamiliesListWhatTheyHave) {
  EXPECT_EQ(parameters_of({}).size(), 3U);
  EXPECT_EQ(parameters_of({.parallel_loss = true, .skin = true}).back(), P::skin_resistance);
  EXPECT_EQ(name(CircuitFamily{.parallel_loss = true, .skin = true}), "R L C, skin, parallel loss");
  EXPECT_EQ(name(CircuitFamily{}), "R L C");
}

}  // namespace
}  // namespace coilassay

// Measured R-L-C resonance curves from a university teaching laboratory (public data, MIT licence beside them, read 2017
// files of a second-year experiment; no maker named), fitted through the project's own least squares.
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <numbers>
#include <sstream>
#include <vector>

#include "fitting/circuit_equations.h"
#include "fitting/circuit_fit.h"
#include "fitting/least_squares.h"
#include "tests/support/paths.h"

namespace coilassay {
namespace {

struct Curve {
  std::vector<double> f, v, u;
};

Curve read_curve(const char* name) {
  std::ifstream in(test::project_file(std::string("tests/published/data/open_data/") + name));
  Curve curve;
  std::string line;
  std::getline(in, line);
  while (std::getline(in, line)) {
    std::istringstream cells(line);
    double f = 0, v = 0, u = 0;
    char comma = 0;
    if (cells >> f >> comma >> v >> comma >> u) {
      curve.f.push_back(f);
      curve.v.push_back(v);
      curve.u.push_back(u);
    }
  }
  return curve;
}

/// Voltage over the capacitor of a driven series circuit: V0 / sqrt((1 - (f/f0)^2)^2 + (f/(f0 Q))^2).
struct Resonance {
  const Curve& curve;
  template <class T>
  bool operator()(const T* p, T* r) const {
    using std::sqrt;
    for (std::size_t i = 0; i < curve.f.size(); ++i) {
      const T x = T(curve.f[i]) / p[0];
      const T a = T(1.0) - x * x;
      const T b = x / p[1];
      r[i] = (p[2] / sqrt(a * a + b * b) - curve.v[i]) / curve.u[i];
    }
    return true;
  }
};

struct Expected {
  const char* file;
  double f_0, u_f_0, q, u_q;
};

class OpenResonance : public testing::TestWithParam<Expected> {};

// Expected: computed with SciPy least squares from the same files (a cross-check, not a published result).
// Nominal: 18 mH and 1.8 nF, f0 27.96 kHz; components of unknown tolerance, taken here as 5 % each (common practice).
TEST_P(OpenResonance, FitAgreesWithScipyAndWithTheNominalParts) {
  const Expected& e = GetParam();
  const Curve curve = read_curve(e.file);
  ASSERT_GT(curve.f.size(), 10U);
  const double start[] = {25e3, 2, 2};
  const auto fit = fit_least_squares<3>(Resonance{curve}, static_cast<int>(curve.f.size()), start);
  ASSERT_TRUE(fit);
  ASSERT_TRUE(fit->usable());
  EXPECT_NEAR(fit->parameters[0], e.f_0, e.u_f_0 / 5);
  EXPECT_NEAR(fit->parameters[1], e.q, e.u_q / 5);
  const double nominal = 1 / (2 * std::numbers::pi * std::sqrt(18e-3 * 1.8e-9));
  EXPECT_NEAR(fit->parameters[0], nominal, 0.05 * nominal);
}

// The voltage over the capacitor of a series circuit is its current over j w C, and its admittance 1/(R + j w L + 1/(j w C)) is that of
// no coil, but as a number it is the impedance of a parallel circuit with C for its inductance and L for its capacitance. So the
// coil's circuit can be fitted to it, by its modulus alone: f_0 and Q do not depend on the scale.
TEST_P(OpenResonance, TheCircuitOfASweepFindsTheSameByItsDual) {
  const Expected& e = GetParam();
  const Curve curve = read_curve(e.file);
  CircuitData data;
  data.u.clear();
  for (std::size_t i = 0; i < curve.f.size(); ++i) {
    data.frequency_hz.push_back(curve.f[i]);
    data.z.emplace_back(2 * std::numbers::pi * curve.f[i] * 1.8e-9 * curve.v[i] / 2.0);
    data.u.push_back(curve.u[i] / curve.v[i]);
  }
  data.u_phase = {HUGE_VAL};
  const auto fit = fit_circuit(data, {.parallel_loss = true});
  ASSERT_TRUE(fit && fit->usable());
  // A leakage of the capacitor, here the series resistance, is not seen; the model of the other fit has none.
  EXPECT_FALSE(fit->seen(CircuitParameter::series_resistance));
  Circuit circuit = fit->circuit;
  circuit[CircuitParameter::series_resistance] = 0;
  const CircuitEquations equations(data, usable_points(data), false);
  circuit = descend(equations, circuit, HeldParameters{1}, 100, 1e-9).circuit;
  const auto f_0 = falling_zero_hz(circuit, 1e4, 1e5);
  ASSERT_TRUE(f_0);
  EXPECT_NEAR(*f_0, e.f_0, e.u_f_0 / 2);   // ln V here, V there: weights differ where V errs by 2 %
  const double q = std::sqrt(circuit[CircuitParameter::capacitance] / circuit[CircuitParameter::inductance]) /
                   circuit[CircuitParameter::parallel_conductance];
  EXPECT_NEAR(q, e.q, e.u_q / 2);
}

INSTANTIATE_TEST_SUITE_P(TeachingLaboratory, OpenResonance,
                         testing::Values(Expected{"rlc_resonance_low_damping.csv", 27494.6, 39.8, 3.137, 0.027},
                                         Expected{"rlc_resonance_high_damping.csv", 27863.5, 66.4, 1.858, 0.018}),
                         [](const auto& one) { return std::string(one.index == 0 ? "LowDamping" : "HighDamping"); });

}  // namespace
}  // namespace coilassay

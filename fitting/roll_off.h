// Curves whose slope rolls off: y against the integral x of a slope g(y) that falls beyond a knee.
#pragma once

#include <cmath>

namespace coilassay {

/// x = integral of g from 0 to y, odd in y, with
///
///   g(y) = g0 (s + (1 - s)/(1 + b z^2 + (1 - b) z^m)),   z = |y|/k.
///
/// At y = k half of what can be lost is lost, whatever the shape. b = 0 is the generalised knee: m = 2 the arctangent (a
/// soft powder), m near 12 a sharp ferrite. b near 0.8 with m near 4 follows the hyperbolic tangent, b < 0 rises before it
/// falls. docs/formulas.md#ramp.
struct RollOff {
  double start_slope = 1;   // g0 > 0
  double floor_share = 0;   // s: what is left of g0 far beyond the knee
  double knee = 1;          // k > 0
  double exponent = 2;      // m > 0
  double bend = 0;          // b

  double slope(double y) const;
  /// By Gauss's rule on panels fine enough for 1e-10 of x.
  double integral(double y) const;
  /// Integral of y dx from 0 to y.
  double work(double y) const;

  /// Smallest y > `from` beyond which g <= (1 - drop) g(from), searched up to `to`; NaN when it is not reached.
  /// Where g first rises the drop still counts from g(from).
  double y_at_drop(double drop, double from, double to) const;
  /// The same for the secant (x(y) - x(from))/(y - from), against g(from).
  double y_at_secant_drop(double drop, double from, double to) const;
  /// Largest g between two places over g at the first.
  double largest_rise(double from, double to) const;
};

}  // namespace coilassay

// The law of a quantity given its measured value: what conformity probabilities are computed from.
#pragma once

#include <optional>

#include "analysis/measurement.h"

namespace coilassay {

/// P(X < x | measured) without prior knowledge (JCGM 106, 7.2), from what an estimate says: value, u, interval, confidence.
///
/// The interval is met exactly: each side holds half of the confidence. In between and beyond, the family follows the
/// coverage factor k = half-width / u: a normal law for 1.96 (at 95 %), a rectangular law convolved with a normal one below
/// that, down to the rectangular law alone at 1.65, Student's t above it. Where the two sides differ, each has its own
/// scale and the value is the median. docs/formulas.md#law-of-the-value
class ValueLaw {
 public:
  /// std::nullopt when the uncertainty is not known.
  static std::optional<ValueLaw> of(const Estimate& estimate);
  /// Normal law; u >= 0.
  static ValueLaw normal(double value, double u);

  /// The same with an independent normal error added (docs/formulas.md#gauge-study).
  ValueLaw widened(double sigma) const;
  /// The same about another measured value.
  ValueLaw about(double value) const;

  double below(double x) const;   // P(X < x)
  double above(double x) const;   // P(X > x), without loss of digits far out
  double inside(std::optional<double> min, std::optional<double> max) const;
  /// Distance from the value down to the point below which there is this much probability (< 1/2), and up likewise.
  double reach_down(double probability) const;
  double reach_up(double probability) const;

  double value() const { return value_; }
  double u() const { return u_; }
  bool symmetric() const { return u_down_ == u_up_; }
  double half_width() const;      // of the 95 % interval, the larger half
  double low() const;             // the 95 % interval
  double high() const;

 private:
  ValueLaw() = default;
  double tail(double distance, double u) const;          // P(deviation > distance) of one side, distance >= 0
  double tail_reach(double probability, double u) const;

  double value_ = 0, u_ = 0;
  double u_down_ = 0, u_up_ = 0;  // scale of each side
  double flat_ = 0;               // share of the variance that is rectangular
  double dof_ = 0;                // of Student's t; 0: not t
};

}  // namespace coilassay

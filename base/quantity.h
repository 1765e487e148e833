// A value never travels alone.
#pragma once

#include <cmath>

#include "base/unit.h"

namespace coilassay {

/// A value with its standard uncertainty and unit.
struct Quantity {
  double value = std::nan("");                 // SI, no prefix
  double standard_uncertainty = std::nan("");  // one sigma, same unit; NaN means "not known", never 0
  Unit unit = Unit::one;
};

constexpr Quantity henries(double value, double u) { return {value, u, Unit::henry}; }
constexpr Quantity farads(double value, double u) { return {value, u, Unit::farad}; }
constexpr Quantity ohms(double value, double u) { return {value, u, Unit::ohm}; }

/// The law by which a stated value may deviate.
enum class Law {
  unstated,     // no tolerance was given: a default of the measurement takes its place, and is named
  exact,        // "±0%"
  rectangular,  // "±1%": anywhere within the half-width, equally likely
  normal,       // "±5pF(k=2)" or "10.0120(25)nF"
};

/// A value as a person or a sheet stated it, with the law of its error.
struct StatedValue {
  double value = std::nan("");                 // SI, no prefix
  Unit unit = Unit::one;
  Law law = Law::unstated;
  double half_width = std::nan("");            // SI; of the rectangular law, NaN for others
  double standard_uncertainty = std::nan("");  // SI; half_width/sqrt(3), or of the normal law; 0 exact, NaN unstated

  static StatedValue exact(double value, Unit unit) { return {value, unit, Law::exact, std::nan(""), 0.0}; }
  static StatedValue rectangular(double value, double half_width, Unit unit) {
    return {value, unit, Law::rectangular, half_width, half_width / std::sqrt(3.0)};
  }
  static StatedValue normal(double value, double u, Unit unit) { return {value, unit, Law::normal, std::nan(""), u}; }
  static StatedValue unstated(double value, Unit unit) { return {value, unit, Law::unstated, std::nan(""), std::nan("")}; }
};

}  // namespace coilassay

// How the inductance of a coil falls with its current: laws of five kinds of core, for simulated benches.
#pragma once

#include <string_view>

namespace coilassay::synthetic {

enum class CoreKind {
  knee,     // a gapped ferrite: L_s + (L_0 - L_s)/(1 + x^m), the exponent m free
  tanh,     // flux L_s i + (L_0 - L_s) I_k tanh(i/I_k)
  powder,   // a soft powder: flux with an arctangent, L_s + (L_0 - L_s)/(1 + x^2)
  ferrite,  // an ungapped or sharply gapped ferrite: the exponent is 12
  rising,   // permeability rises first: L_s + (L_0 - L_s)(1 + x^2/3)/(1 + x^8)
};
std::string_view name(CoreKind kind);

/// Incremental inductance d(flux)/di against x = |i|/I_k.
struct CoreLaw {
  CoreKind kind = CoreKind::knee;
  double inductance_h = 10e-6;          // at zero current
  double saturated_inductance_h = 1e-6;
  double knee_current_a = 10;
  double exponent = 6;                  // of the kind `knee`

  double incremental(double current_a) const;
  double flux(double current_a) const;  // by Simpson's rule to 1e-12
  /// Smallest current beyond which the incremental inductance, or flux over current, has dropped so far below L_0; NaN when
  /// it is not below 100 I_k.
  double current_at_drop(double drop) const;
  double current_at_secant_drop(double drop) const;
};

}  // namespace coilassay::synthetic

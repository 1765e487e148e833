// Flux of one pulse, and the winding resistance it needs.
#pragma once

#include <optional>
#include <vector>

#include "acquire/bench_sheet.h"
#include "analysis/budget.h"
#include "analysis/ramp_pulses.h"

namespace coilassay {

/// Integrals over one pulse by the trapezoidal rule, from the sample before its start; element k belongs to sample
/// first + k. Zero at the origin.
struct PulseIntegrals {
  std::size_t first = 0;
  std::vector<double> volt_seconds;   // of the voltage over the coil
  std::vector<double> charge;         // of the current, A s

  std::vector<double> flux(double resistance_ohm) const;
};
PulseIntegrals integrals_of(const RampLayout& layout, const RampPulse& pulse);

/// The winding resistance as the flux needs it.
struct RampResistance {
  enum class From { stated, closure, unknown } from = From::unknown;
  InputError error;       // "winding resistance", ohm
  double closure_ohm = 0, closure_u_ohm = 0;   // of the pulses that return; u NaN when none does
};

/// Stated (--dcr); or, where the current returns to zero, the one that closes the flux: integral of v dt over integral of
/// i dt between two instants without current; or a default that says so.
RampResistance resistance_of(const RampLayout& layout, const std::vector<PulseIntegrals>& integrals, const BenchSetup& bench,
                             const PropagationOptions& options);

}  // namespace coilassay

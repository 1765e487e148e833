// Pieces of a ring-down result that one capacitor and several have in common.
#pragma once

#include <cmath>
#include <span>
#include <string>

#include "analysis/measurement.h"
#include "analysis/ring_down.h"
#include "analysis/ring_down_circuit.h"
#include "analysis/ring_down_decay.h"

namespace coilassay {

/// Rates of a decay in SI for one draw of the inputs; NaN where the draw admits none.
struct DecayRates {
  double omega0, alpha, damped;   // rad/s, 1/s, rad/s (0 when overdamped)
};

/// The errors of one decay: a and q from the fit, and what misfit and the choice of the start may have moved.
class DecayErrors {
 public:
  /// Adds its inputs to the circuit; `label` tells several captures apart in the budget (" 2").
  DecayErrors(RingDownCircuit& circuit, const CaptureDecay& decay, const std::string& label, std::size_t fitted_offset = 0);

  FittedInputs fitted(const CaptureDecay& decay) const;
  /// x: all inputs of the circuit, then the fitted values.
  DecayRates rates(std::span<const double> x, const RingDownCircuit& circuit) const;

 private:
  double step_s_;
  std::size_t misfit_a_, misfit_q_, start_a_, start_q_;
  std::size_t fitted_offset_;     // of this decay's a among the fitted values
};

/// Test name, source, stated conditions and equipment.
void describe_source(Measurement& result, const Capture& capture, const RingDownRequest& request);

ModelSummary model_of(const CaptureDecay& decay);

/// near_critical.
void note_damping(Measurement& result);

/// Takes a quantity out of a result, with its budget and correlations.
void withhold(Measurement& result, const std::string& symbol);

/// A resistance whose standard uncertainty exceeds it becomes an upper bound, with finding resistance_unresolved.
void withhold_unresolved(Measurement& result);

/// capacitor_dominates, probe_loading, capacitor_loss.
void note_loads(Measurement& result, const RingDownCircuit& circuit, const RingDownRequest& request);

/// What stood across the coil and flowed in it at the release, or at the start of the window where that is the first known.
struct ReleaseLevel {
  double peak_v = 0;
  double peak_a = std::nan(""), energy_j = std::nan("");   // NaN without an inductance
  bool at_release = false;                                 // earlier than the window
};
/// NaN inductance and capacitance: not known. An overdamped decay has no level that is known this way: all zero.
ReleaseLevel release_level(const CaptureDecay& decay, double inductance_h, double capacitance_f);

/// Peak current at the start of the window as a condition; cautions about the release.
void add_release_level(Measurement& result, const CaptureDecay& decay, const RingDownCircuit& circuit);

}  // namespace coilassay

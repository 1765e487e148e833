// Impedance of a coil from a steady sine: voltage over it and current through it.
#pragma once

#include <optional>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

struct SineRequest {
  BenchSetup bench;                     // winding_resistance gives P_winding
  std::optional<double> from_s, to_s;   // window, in the time of the capture
  std::optional<StatedValue> turns_ratio;   // driven over sense turns: the voltage is that of a sense winding
  std::vector<StatedValue> biases;      // of several captures, in order; empty: not stated
  PropagationOptions propagation;
  bool traces = false;                  // add what a figure needs: trace_capture, trace_fit, trace_residual, trace_impedance
};

/// Z, phi, R_s, X_s, L_s, R_p, L_p, Q, D, f and P at the frequency of one capture; P_winding with a winding resistance.
///
/// Model (docs/formulas.md#sine): Z = V/I of the phasors of one common frequency, the current divided by what its chain
/// did to it (skew, shunt inductance, probe droop). L_s and L_p are left out when the reactance is not that of a coil.
/// With a turns ratio the voltage is what the flux induces in the driven winding: Z, R_s and P are then those of the core,
/// without the winding's resistance and leakage.
/// What the uncertainty hides is withheld to a bound: R_s, D and P when u(R_s) exceeds R_s. A capture without a common
/// sine gives a Measurement without Z whose findings say why; a failure is returned only for what is wrong with the
/// request (missing_column, usage).
Result<Measurement> measure_sine(const Capture& capture, const SineRequest& request);

/// Several captures over frequency, level or bias: the quantities of the first, all of them as points, and over at least
/// three bias currents I_sat_10/20/30 (definition bias_small_signal) by interpolation of L_s over bias. usage when
/// biases are stated and their number is not that of the captures.
Result<Measurement> measure_sine_points(const std::vector<Capture>& captures, const SineRequest& request);

}  // namespace coilassay

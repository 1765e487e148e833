// Inductance and series resistance from the free decay of a coil across known capacitors.
#pragma once

#include <optional>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

struct RingDownRequest {
  BenchSetup bench;
  std::optional<double> from_s, to_s;   // window, in the time of the capture
  PropagationOptions propagation;
  bool traces = false;                  // add what a figure needs: trace_capture, trace_fit, trace_residual, line
};

/// Default tolerances (docs/uncertainty.md): what enters when something was left unsaid.
namespace ring_down_defaults {
inline constexpr double kCapacitorRatio = 0.05;          // the usual grade of film capacitors
inline constexpr double kProbeCapacitance_f = 20e-12;    // nothing, or a divider probe on its input
inline constexpr double kProbeConductance_s = 1e-6;      // nothing, or the 1 Mohm of a bare input
inline constexpr double kDissipation = 1e-3;             // nothing, or a fair film capacitor
inline constexpr double kTimebaseRatio = 100e-6;         // a poor crystal
inline constexpr double kStatedCapacitanceRatio = 0.2;   // of a probe or stray capacitance given without tolerance
inline constexpr double kStatedResistanceRatio = 0.05;   // of a resistance given without tolerance
}  // namespace ring_down_defaults

/// f_0, f_d, alpha, Q of one free decay; with one capacitor in the set-up also L_s, R_s and Q_coil.
///
/// Relations (docs/formulas.md#ring-down): (2 pi f_0)^2 = (1 + R_s/R)/(L_s C), 2 alpha = R_s/L_s + 1/(R C) + 2 pi f_0 D_C.
/// A capture that holds no ringing gives a Measurement without f_0 whose findings say why; a failure is returned only
/// for what is wrong with the request (missing_column, a capture without a time step).
Result<Measurement> measure_ring_down(const Capture& capture, const RingDownRequest& request);

/// Several captures, each with its own capacitor in order: L and C_par by the line 1/(2 pi f_0)^2 = L (C + C_par), errors
/// in both directions, and whether the points lie on a line. usage when the counts differ.
Result<Measurement> measure_ring_down_line(const std::vector<Capture>& captures, const RingDownRequest& request);

}  // namespace coilassay

// Saturation of a coil from voltage and current while it is driven up: L_0, I_sat, the curve L(i).
#pragma once

#include <optional>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

struct RampRequest {
  BenchSetup bench;
  std::optional<double> from_s, to_s;   // part of the record to look at
  PropagationOptions propagation;
  bool traces = false;                  // add what a figure needs: trace_ramp
};

/// Default tolerances beside those of driven tests (docs/uncertainty.md).
namespace ramp_defaults {
inline constexpr double kResistanceRatio = 0.1;      // of --dcr without tolerance: a winding 25 K off
inline constexpr double kUnknownDropRatio = 0.025;   // resistance not known: drops 2.5 % +- 2.5 % of the voltage at the peak
inline constexpr double kHopelessMisfit = 30;         // variance of the blocks about the curve over that inside them
inline constexpr double kUnknownOffsetRatio = 0.01;  // of the largest value, when nothing in the record shows the zero line
}  // namespace ramp_defaults

/// Flux from the coil's voltage, flux = integral of (v - R i) dt, and the current as a function of it (docs/formulas.md#ramp).
///
/// Establishes, as far as the record goes: L_0, I_sat_10/20/30 and their secant kind, E_max; R_dc when the current returns to
/// zero in the record and no --dcr was given; W_loop when it returns and --dcr was given. Tables: curve, pulses (several).
/// The interval holds noise, gains, resistance, zero lines, skew, shunt inductance, droop, time base and the choice of the
/// curve. A record that shows no ramp gives a Measurement without L_0 whose findings say why; a failure is returned for
/// what is wrong with the request (driven_record()).
Result<Measurement> measure_ramp(const Capture& capture, const RampRequest& request);

}  // namespace coilassay

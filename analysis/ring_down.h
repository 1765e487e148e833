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
};

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

// One capture's free decay, ready to be turned into quantities: shared by one capacitor and by several.
#pragma once

#include <optional>
#include <vector>

#include "analysis/decay_structure.h"
#include "analysis/decay_window.h"
#include "analysis/measurement.h"
#include "analysis/ring_down.h"
#include "base/result.h"
#include "fitting/decay_contour.h"

namespace coilassay {

/// Decay of one capture in samples, with what was noticed about it.
struct CaptureDecay {
  double step_s = 0;
  double start_s = 0;                  // time of sample 0
  double gain = 1;                     // volts per unit of the column
  std::vector<double> own_samples;     // of a record that was uneven, a difference of columns, or without clipped samples
  std::span<const double> samples;     // of the whole record
  std::optional<Decay> decay;          // absent: no ringing; findings say why
  std::size_t release = 0;             // first sample of the free decay, a start transient and clipped crests included
  DecayStructure structure;
  std::vector<DecayPoint> contour;     // edge of the 95 % region of (a, q) near critical damping; empty elsewhere
  std::vector<Finding> findings;

  /// a, q and their covariance, of the first mode.
  double a() const;
  double q() const;
  Eigen::MatrixXd covariance() const;
  const DampedSine& model() const;
};

/// Voltage channel, window, fit, structure and capture findings. missing_column, or a record without time, is a failure.
Result<CaptureDecay> decay_of_capture(const Capture& capture, const RingDownRequest& request);

/// Traces for a figure: trace_capture, trace_fit, trace_residual, at most about two thousand points each.
void add_traces(Measurement& result, const CaptureDecay& decay);

}  // namespace coilassay

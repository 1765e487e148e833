// One capture's common sine, ready to be turned into quantities: shared by the impedance and by the skew.
#pragma once

#include <complex>
#include <optional>
#include <span>
#include <vector>

#include "analysis/driven_capture.h"
#include "analysis/sine.h"
#include "fitting/sine_fit.h"

namespace coilassay {

struct SineRecord {
  DrivenRecord record;
  std::size_t first = 0, end = 0;   // window
  std::optional<SineFit> fit;       // absent: findings say why
  std::vector<Finding> findings;
  std::span<const double> volts() const { return std::span(record.volts).subspan(first, end - first); }
  std::span<const double> amps() const { return std::span(record.amps).subspan(first, end - first); }
};

/// Columns, window, clipped samples left out, fit, and whether both channels show one steady frequency.
Result<SineRecord> sine_of_capture(const Capture& capture, const SineRequest& request);

/// The inputs of a sine's measurement function and what they mean: errors of the bench, then frequency and phasors.
class SineInputs {
 public:
  explicit SineInputs(const SineRecord& sine);

  std::vector<InputError>& errors() { return errors_; }
  const FittedInputs& fitted() const { return fitted_; }

  /// Phasors (peak) and angular frequency for one draw, the current's chain taken out but for the skew when asked.
  struct Draw {
    double omega;
    std::complex<double> volts, amps;
  };
  Draw draw(std::span<const double> x, bool skew_taken_out = true) const;
  std::vector<double> best() const;

 private:
  std::vector<InputError> errors_;
  FittedInputs fitted_;
  double step_s_;
  bool shunt_;   // the factor of the current is a resistance
};

/// Traces for a figure, at most about two thousand points each.
void add_sine_traces(Measurement& result, const SineRecord& sine);

}  // namespace coilassay

// Where a driven record holds its ramps: quiet stretch, drive, freewheel.
#pragma once

#include <cstddef>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "analysis/driven_capture.h"
#include "base/finding.h"

namespace coilassay {

/// One drive of the coil, in samples of the record.
struct RampPulse {
  std::size_t start = 0;     // first sample with the drive on
  std::size_t peak = 0;      // one past the last sample of the rise
  std::size_t end = 0;       // one past the fall; equal to `peak` when the record does not hold it
  bool returns = false;      // the current is back near zero at `end`
  bool clipped = false;      // the rise was cut where the current channel ends
  bool plateau = false;      // the current stood still at the end of the drive
  double drive_v = 0;        // median voltage of the rise
  double edge_v = 0;         // largest jump of the voltage between two samples at the start
  double start_a = 0;        // current just before the drive
  double start_u_a = 0;
};

/// The record with its zero lines subtracted and its polarity positive, and the pulses in it.
struct RampLayout {
  std::vector<double> volts, amps;
  double start_s = 0, step_s = 0;
  std::size_t first = 0;                   // of the record's samples
  std::vector<RampPulse> pulses;
  bool zero_known = false;                 // a quiet stretch shows the zero lines
  double volt_zero = 0, volt_zero_u = 0;
  double amp_zero = 0, amp_zero_u = 0;
  double volt_noise = 0, amp_noise = 0;    // r.m.s. of single samples
  double peak_a = 0;
  std::vector<Finding> findings;           // a refusal among them: there is no ramp to measure
  bool refused() const;
};

/// Finds everything. Refusals: `clipped` (voltage or current at the end of its range throughout), `no_ramp` (no current, no
/// drive, too few samples), `scale_suspect` (voltage and current look swapped). `capture` is the one the record came from.
RampLayout find_ramps(const Capture& capture, const DrivenRecord& record, std::optional<double> from_s,
                      std::optional<double> to_s);

}  // namespace coilassay

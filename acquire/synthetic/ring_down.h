// A simulated ring-down bench: the circuit solved exactly, then looked at through a simulated scope.
#pragma once

#include <cstdint>
#include <optional>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// A coil (L, R in series, C_par across) with a capacitor, probe and whatever else stays connected across it, released
/// at time 0 with a current in the coil and a voltage on the capacitor.
struct RingDownBench {
  // coil
  double inductance_h = 47e-6;
  double resistance_ohm = 0.35;             // effective series resistance at resonance
  double parallel_capacitance_f = 0;
  double saturation_per_a2 = 0;             // L(i) = L / (1 + saturation_per_a2 i^2): level dependence (stepped, not closed form)
  // what hangs across it
  double capacitance_f = 10e-9;
  double capacitor_dissipation = 0;         // as in docs/formulas.md: adds w0 D to 2 alpha
  double probe_capacitance_f = 13e-12;
  double probe_resistance_ohm = 10e6;
  double across_resistance_ohm = 0;         // 0: nothing there
  double across_capacitance_f = 0;
  // second mode added to the voltage, relative to the first
  double second_amplitude_ratio = 0;
  double second_frequency_ratio = 1.3;
  double second_decay_ratio = 1;
  // release
  double initial_current_a = 0.05;
  double initial_voltage_v = 0;
  double drive_time_s = 0;                  // forced portion before the release, at drive_frequency_hz (0: DC)
  double drive_frequency_hz = 0;
  double transient_ratio = 0;               // fast exponential of this share of the amplitude after the release
  double transient_tau_s = 0;
  // scope
  std::size_t samples = 20000;
  double sample_interval_s = 0;             // 0: eight decay times or 40 periods across the record, whichever is less
  double pretrigger_fraction = 0.1;
  double noise_v = 0;
  double offset_v = 0;
  double gain = 1;                          // scale error of the voltage channel
  double timebase_error = 0;                // ratio
  int bits = 0;                             // 0: no quantisation
  double full_scale_v = 0;                  // half range; 0: 1.2 times the largest value
  bool drive_channel = false;               // a second channel that shows the drive switching off
  std::uint64_t seed = 1;
};

/// What the coil really is, for the truth document.
struct RingDownTruth {
  double l_s_h, r_s_ohm, f_0_hz, f_d_hz, alpha_per_s, q, q_coil, c_total_f, peak_current_a, peak_voltage_v;
};

/// Simulates; truth is exact (f_0 and alpha from the circuit's eigenvalues at small level).
struct RingDownRecord {
  Capture capture;
  RingDownTruth truth;
};
Result<RingDownRecord> simulate_ring_down(const RingDownBench& bench);

}  // namespace coilassay::synthetic

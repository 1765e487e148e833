// A simulated ring-down bench: the circuit solved exactly, then looked at through a simulated scope.
#pragma once

#include <cstdint>
#include <optional>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// A coil (L, R in series, C_par across) with a capacitor, probe and whatever else stays connected across it, released
/// at time 0 with a current in the coil and a voltage on the capacitor (synthetic/resonant_circuit.h has the equations).
///
/// All capacitances are one, C_total; the loss of the capacitor is a resistance in series with it, D/(w0 C_total) at the
/// circuit's own w0, so that the bench follows the relations
///   (2 pi f_0)^2 = (1 + R_s/R)/(L_s C_total),   2 alpha = R_s/L_s + 1/(R C_total) + 2 pi f_0 D
/// exactly without loss or without anything across, and otherwise but for relative terms of D/(2 pi f_0 R C) and R_s/R.
///
/// Before the release the coil carries the drive's current, the node shows R_s i + L(i) di/dt; before the drive, and
/// always when there is none, both are zero. A sine drive runs straight into the state at release (current, voltage and
/// the slope of the current are continuous); a DC drive rises evenly over the first half of its time, then holds, and
/// what `initial_voltage_v` differs from the hold's R_s i is the step of the switch.
struct RingDownBench {
  // coil
  double inductance_h = 47e-6;
  double resistance_ohm = 0.35;             // effective series resistance at resonance
  double parallel_capacitance_f = 0;
  double saturation_per_a2 = 0;             // incremental L(i) = L / (1 + saturation_per_a2 i^2): stepped, not closed form
  // what hangs across it
  double capacitance_f = 10e-9;
  double capacitor_dissipation = 0;         // as in docs/formulas.md: adds w0 D to 2 alpha
  double probe_capacitance_f = 13e-12;
  double probe_resistance_ohm = 10e6;       // infinity: none
  double across_resistance_ohm = 0;         // 0: nothing there
  double across_capacitance_f = 0;
  // second mode added to the voltage, relative to the first and in its phase; the first counts as
  // sqrt(V^2 + I^2 L/C_total), from its voltage and current at release
  double second_amplitude_ratio = 0;
  double second_frequency_ratio = 1.3;
  double second_decay_ratio = 1;
  // release
  double initial_current_a = 0.05;
  double initial_voltage_v = 0;
  double drive_time_s = 0;                  // forced portion before the release, at drive_frequency_hz (0: DC)
  double drive_frequency_hz = 0;
  double transient_ratio = 0;               // fast exponential of this share of that amplitude after the release
  double transient_tau_s = 0;
  // scope
  std::size_t samples = 20000;
  double sample_interval_s = 0;             // 0: eight decay times or 40 periods across the record, whichever is less,
                                            // and at least ten samples a period
  double pretrigger_fraction = 0.1;
  double noise_v = 0;
  double offset_v = 0;
  double gain = 1;                          // scale error of the voltage channel
  double timebase_error = 0;                // ratio: true interval = shown interval times (1 + this)
  int bits = 0;                             // 0: no quantisation; at most 24
  double full_scale_v = 0;                  // half range; 0: 1.2 times the largest value
  bool drive_channel = false;               // a second channel, CH2: 5 V while the drive is on, 0 V from the release on
  std::uint64_t seed = 1;
};

/// What the coil really is, for the truth document: from the bench and the circuit's eigenvalues at small level. What a
/// scope does to the record, the second mode and the transient are no part of it.
struct RingDownTruth {
  double l_s_h, r_s_ohm;         // the coil's own, C_par apart
  double f_0_hz;                 // natural frequency, sqrt of the product of the eigenvalues
  double f_d_hz;                 // damped frequency; 0 at and beyond critical damping
  double alpha_per_s;            // half the sum of the decay rates
  double q;                      // pi f_0/alpha of the whole circuit; infinite without loss
  double q_coil;                 // 2 pi f_0 L_s/R_s; infinite without resistance
  double c_total_f;              // capacitor, probe, across and C_par
  double peak_current_a;         // largest magnitude in the coil from the release on
  double peak_voltage_v;         // largest magnitude across it
  double c_par_f;                // the coil's own capacitance
  double apparent_l_s_h;         // what the relations give when C_par is left out of the total: L_s (C + C_par)/C ...
  double apparent_r_s_ohm;       // ... and this R_s with it
};

struct RingDownRecord {
  Capture capture;
  RingDownTruth truth;
};

/// Simulates one record: channel CH1 in V (with `drive_channel` CH2), the release on a sample at time 0 of the axis. The
/// same bench gives the same bytes. Source: name "simulated", the digest and count of the samples' bytes as float64 in
/// little-endian order, channel after channel.
///
/// @return bad_number for a bench that cannot be (no inductance, a negative resistance, not a number), with what and why.
Result<RingDownRecord> simulate_ring_down(const RingDownBench& bench);

}  // namespace coilassay::synthetic

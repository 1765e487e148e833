// A simulated steady-sine bench: the circuit's phasors solved exactly, then looked at through a simulated two-channel scope.
#pragma once

#include <cstdint>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// A sine of `amplitude_v` over the coil, which is L and R in series with C_par across:
///
///   Z = (R + j w L_b)/(1 + j w C_par (R + j w L_b)),   I = V/Z,   L_b = L/(1 + saturation i_bias^2)
///
/// The current passes the sense element: with a shunt the current channel is volts, (R_shunt + j w L_shunt) I; a current
/// probe's droop is the factor j w/(j w + w_1); the channel lags the voltage channel by the skew. With `over_shunt` the
/// voltage channel shows coil and shunt together.
struct DrivenSineBench {
  // coil
  double inductance_h = 1e-3;
  double resistance_ohm = 2;
  double parallel_capacitance_f = 0;
  double saturation_per_a2 = 0;           // how L falls with the bias
  double third_harmonic_ratio = 0;        // of the current, relative to its fundamental and in phase with it at its crest
  // drive
  double frequency_hz = 10e3;
  double amplitude_v = 1;                 // peak, over the coil
  double phase_rad = 0.4;                 // of the voltage at time 0
  double bias_a = 0;
  // current channel, CH2
  double shunt_ohm = 0, shunt_inductance_h = 0;   // 0: the channel is in ampere
  double skew_s = 0;
  double probe_corner_hz = 0;             // 0: none; a probe with a corner shows no bias
  double current_offset_a = 0, current_gain = 1, current_noise_a = 0, current_full_scale_a = 0;
  // voltage channel, CH1
  bool over_shunt = false;
  double voltage_offset_v = 0, voltage_gain = 1, voltage_noise_v = 0, voltage_full_scale_v = 0;
  // scope
  std::size_t samples = 10000;
  double sample_interval_s = 0;           // 0: the record holds 20.3 periods
  double timebase_error = 0;              // ratio: true interval = shown interval times (1 + this)
  int bits = 0;                           // 0: no quantisation; at most 24
  std::uint64_t seed = 1;
};

/// What the coil really is at this frequency and bias.
struct DrivenSineTruth {
  double f_hz;
  double z_ohm, phi_rad, r_s_ohm, x_s_ohm, l_s_h, r_p_ohm, l_p_h, q, d;
  double p_w;                             // real power in the coil by the fundamental
  double current_a;                       // peak
};

struct DrivenSineRecord {
  Capture capture;                        // CH1 [V], CH2 [A] or with a shunt [V]
  DrivenSineTruth truth;
};

/// Simulates one record; the same bench gives the same bytes.
/// @return bad_number for a bench that cannot be, with what and why.
Result<DrivenSineRecord> simulate_driven_sine(const DrivenSineBench& bench);

}  // namespace coilassay::synthetic

// A simulated burst bench: a coil driven by a pulse, a chirp or noise through a resistance, stepped exactly, then looked at
// through a simulated two-channel scope.
#pragma once

#include <cstdint>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay::synthetic {

enum class BurstKind { pulse, chirp, noise };

/// A source e behind R_source drives a coil: L and R in series, across both C_par and R_par.
///
///   L di/dt = v - R i,   C_par dv/dt = (e - v)/R_source - i - v/R_par,   current of the part (e - v)/R_source
///
/// e runs straight between the points of a grid sixteen times finer than the samples and through two poles at a fifth of the
/// sample rate, so that samples lose little of it; the circuit is solved exactly (matrix exponential) from point to point. With a shunt the current channel is volts, R_shunt i + L_shunt di/dt; the
/// channel lags the voltage channel by the skew. The shunt's own voltage is part of the source's side.
struct DrivenBurstBench {
  // coil
  double inductance_h = 100e-6;
  double resistance_ohm = 0.5;
  double parallel_capacitance_f = 10e-12;   // above 0
  double parallel_resistance_ohm = 0;       // 0: none
  // source
  BurstKind kind = BurstKind::pulse;
  double amplitude_v = 5;                   // of the source without load: peak; of noise the r.m.s. value
  double source_ohm = 50;
  double width_s = 0.4e-6;                  // of a pulse, between the middles of its edges
  double rise_s = 0.1e-6;                   // of its edges, a half cosine
  std::size_t pulses = 1;                   // spread evenly over the record
  double from_hz = 20e3, to_hz = 5e6;       // of a chirp, of noise (four-pole low pass, one-pole high pass)
  double filled = 0.6;                      // share of the record that a chirp takes; 1: it begins before and never ends
  // current channel, CH2
  double shunt_ohm = 0, shunt_inductance_h = 0;   // 0: the channel is in ampere
  double skew_s = 0;
  double current_offset_a = 0, current_gain = 1, current_noise_a = 0, current_full_scale_a = 0;
  // voltage channel, CH1
  double voltage_offset_v = 0, voltage_gain = 1, voltage_noise_v = 0, voltage_full_scale_v = 0;
  // scope
  std::size_t samples = 20000;
  double sample_interval_s = 10e-9;
  double pretrigger_fraction = 0.05;        // before the burst
  double timebase_error = 0;                // ratio: true interval = shown interval times (1 + this)
  int bits = 0;                             // 0: no quantisation; at most 24
  std::uint64_t seed = 1;
};

/// What the coil really is.
struct DrivenBurstTruth {
  double l_h, r_dc_ohm, c_par_f, r_par_ohm;   // r_par infinite when there is none
  double f_r_hz;                              // where the impedance turns from inductive to capacitive; NaN: never inductive
  double peak_current_a;
};

struct DrivenBurstRecord {
  Capture capture;                            // CH1 [V], CH2 [A] or with a shunt [V]
  DrivenBurstTruth truth;
};

/// Simulates one record; the same bench gives the same bytes.
/// @return bad_number for a bench that cannot be, with what and why.
Result<DrivenBurstRecord> simulate_driven_burst(const DrivenBurstBench& bench);

}  // namespace coilassay::synthetic

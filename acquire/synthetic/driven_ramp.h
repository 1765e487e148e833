// A simulated saturation test: a coil switched onto a supply, stepped through its non-linear circuit, then looked at through
// a simulated two-channel scope.
#pragma once

#include <array>
#include <cstdint>

#include "acquire/capture.h"
#include "acquire/synthetic/core_law.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// A capacitor bank (or a stiff supply) drives the coil through a switch and the sense resistor from time 0 on:
///
///   d(flux)/dt = u - R i,   d(flux) = L(i) di,   u = v_bank - (R_switch + R_shunt) i,   C dv_bank/dt = -i
///
/// A switch at its limit lets no more than `current_limit_a` through and takes the rest of the voltage. At the end of the
/// drive the current flows on through a diode (u = -V_diode - R_shunt i) until it reaches zero. Before the drive and after
/// that everything is at rest. An eddy-current loss is a resistance across the inductance; the winding and the current
/// channel carry both currents.
///
/// Current channel: ampere, or with a shunt volts (R_shunt i + L_shunt di/dt); behind the voltage channel by the skew; a
/// current probe's droop is a one-pole high-pass.
struct DrivenRampBench {
  CoreLaw core;
  double resistance_ohm = 0.05;
  double core_loss_ohm = 0;               // across the inductance; 0: none
  double first_pulse_ratio = 1;           // inductance of the first pulse over that of the later ones (remanence)
  // drive
  double supply_v = 10;
  double switch_resistance_ohm = 0;
  double bank_capacitance_f = 0;          // 0: a stiff supply; recharged before each pulse
  double current_limit_a = 0;             // of the switch; 0: none
  double peak_current_a = 15;             // ends the drive, unless a time does
  double drive_time_s = 0;                // 0: until the peak current
  bool freewheel = false;                 // the record holds the fall through the diode
  double diode_v = 0.7;
  std::size_t pulses = 1;                 // more than one needs the freewheel
  double rest_ratio = 0.3;                // rest after each fall, in lengths of drive and fall
  // voltage channel, CH1
  double voltage_offset_v = 0, voltage_gain = 1, voltage_noise_v = 0, voltage_full_scale_v = 0;
  bool voltage_at_supply = false;         // taken before switch and shunt, not over the coil
  // current channel, CH2
  double shunt_ohm = 0, shunt_inductance_h = 0;
  double skew_s = 0;                      // later than the voltage
  double probe_corner_hz = 0;
  double current_offset_a = 0, current_gain = 1, current_noise_a = 0, current_full_scale_a = 0;
  // scope
  std::size_t samples = 10000;
  double sample_interval_s = 0;           // 0: the record just holds all pulses
  double pretrigger_fraction = 0.1;
  double timebase_error = 0;
  int bits = 0;
  std::uint64_t seed = 1;
};

struct DrivenRampTruth {
  double l_0_h;
  std::array<double, 3> i_sat_a, i_sat_secant_a;   // 10, 20, 30 %; NaN: beyond 100 knee currents
  double r_dc_ohm;
  double peak_current_a, peak_flux_wb, peak_energy_j;
  double drive_time_s;
  double w_loop_j;                                 // lost in the core from one pulse; NaN when the fall is not in the record
};

struct DrivenRampRecord {
  Capture capture;
  DrivenRampTruth truth;
};

/// Steps of the classical fourth-order rule, at most a 4000th of the drive long: good to 1e-9 of the peak. CH1 in V, CH2 in A
/// (with a shunt: V); the drive begins at time 0, on a sample. The same bench gives the same bytes.
/// @return bad_number for a bench that cannot be, or a peak current that the supply never reaches.
Result<DrivenRampRecord> simulate_driven_ramp(const DrivenRampBench& bench);

}  // namespace coilassay::synthetic

// A simulated bench for four-wire readings: a winding with a direct current that warms it, read by two meters.
#pragma once

#include <cstdint>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// A winding of resistance R_20 (1 + coefficient (T - 20 degC)) carries a current of alternating polarity; a voltmeter with its own
/// two wires and an ammeter read it. The winding warms by what it turns into heat and gives it off to the air,
///   tau dT/dt = I^2 R(T) R_th - (T - T_air),
/// stepped by the classical Runge-Kutta rule at a hundredth of tau or finer; without R_th it stays at its first temperature.
struct DrivenResistanceBench {
  // winding
  double resistance_20_ohm = 0.35;
  double coefficient_per_k = 0.00393;
  double temperature_degc = 23;             // of the winding at the first reading, and of the air
  double thermal_resistance_k_per_w = 0;
  double thermal_time_s = 60;
  double preheat_s = 0;                     // how long the current flowed before the first reading
  // current
  double current_a = 1;
  bool one_polarity = false;
  std::size_t before_reversal = 1;          // readings of one polarity before the current is turned round
  double current_noise_a = 0;               // r.m.s., of the current itself: the voltage follows it
  // meters; shown = scale * true + zero + noise, rounded to the last digit
  double thermal_offset_v = 0;              // in series with the voltmeter
  double noise_v = 0, noise_a = 0;          // r.m.s.
  double scale_v = 1, scale_a = 1;
  double zero_v = 0, zero_a = 0;
  double digit_v = 0, digit_a = 0;          // 0: not rounded
  double shunt_ohm = 0;                     // the second column is the voltage across it; 0: it is in ampere
  std::size_t readings = 20;
  double interval_s = 2;
  std::uint64_t seed = 1;
};

struct DrivenResistanceTruth {
  double r_dc_ohm = 0;          // at the first reading
  double r_dc_last_ohm = 0;     // at the last
  double r_dc_20_ohm = 0;
  double warming_k = 0;         // from the first reading to the last
};

struct DrivenResistanceRecord {
  Capture capture;              // channels "voltage" [V] and "current" [A], or "shunt" [V]
  DrivenResistanceTruth truth;
};

/// bad_number when a value makes no bench: no reading, no interval, a resistance that is not above zero at some temperature.
Result<DrivenResistanceRecord> simulate_driven_resistance(const DrivenResistanceBench& bench);

}  // namespace coilassay::synthetic

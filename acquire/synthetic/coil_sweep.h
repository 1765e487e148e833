// A simulated impedance sweep: the coil's circuit in closed form, then seen by an imperfect analyser.
#pragma once

#include <complex>
#include <cstddef>
#include <cstdint>
#include <vector>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// The coil is a series branch with a capacitance, a loss resistance and perhaps a second tank across it, w = 2 pi f:
///
///   Z_s = R + j w L + (1 + j) R_skin sqrt(f/f_skin) + R_prox x^2/(1 + j x),   x = f/f_prox
///   Z   = 1/(1/Z_s + j w C + 1/R_par + Y_2),   Y_2 = j w C_2/(1 - y^2 + j y/Q_2),   y = f/f_2
///
/// The proximity term grows with f^2 below its corner and levels off at R_prox above, where it has taken R_prox/(2 pi f_prox)
/// from the inductance: a part of the coil with a resistance across it. L is the inductance at low frequency.
struct CoilSweepBench {
  // coil; a resistance of 0 leaves its term out
  double inductance_h = 100e-6;
  double resistance_ohm = 0.5;
  double skin_ohm = 0, skin_frequency_hz = 1e6;
  double proximity_ohm = 0, proximity_frequency_hz = 10e6;
  double parallel_capacitance_f = 10e-12;
  double parallel_resistance_ohm = 0;
  double second_frequency_hz = 0, second_capacitance_f = 1e-12, second_q = 20;   // frequency 0: none
  // what stands between the coil and the analyser: Z_m = Z_short + 1/(1/Z + Y_open)
  double residual_inductance_h = 0, residual_resistance_ohm = 0, residual_capacitance_f = 0, residual_conductance_s = 0;
  // grid
  double start_hz = 1e3, stop_hz = 30e6;
  std::size_t points = 201;
  bool linear = false;                  // even steps; else even ratios
  // analyser
  double noise_ratio = 0;               // of Z, standard deviation of each part of the complex ratio
  double scattering_noise = 0;          // of S, standard deviation of each part
  double reference_ohm = 50;
  double gain = 1;                      // what it shows of an ohm
  double phase_error_rad = 0;           // added to every angle
  std::complex<double> scattering_error = 0;  // added to every S
  double step_ratio = 0, step_frequency_hz = 0;  // from there on everything reads this much larger: a range change gone wrong
  std::size_t outliers = 0;             // points thrown off by 30 % in some direction, not marked
  std::size_t marked = 0;               // points of nonsense that the analyser marks as bad
  std::uint64_t seed = 1;
};

/// What the coil really is.
struct CoilSweepTruth {
  double f_r_hz;            // lowest frequency where the reactance goes from positive to negative; NaN: none up to 1000 x stop
  double f_parallel_hz;     // 1/(2 pi sqrt(L C)), NaN without a capacitance
  std::vector<std::size_t> outliers, marked;   // positions of the spoilt points
};

struct CoilSweepRecord {
  Sweep sweep;              // one port; `bad` where marked
  CoilSweepTruth truth;
};

/// The coil's impedance at one frequency.
std::complex<double> coil_impedance(const CoilSweepBench& bench, double frequency_hz);

/// Simulates one sweep; the same bench gives the same numbers.
/// @return bad_number for a bench that cannot be, with what and why.
Result<CoilSweepRecord> simulate_coil_sweep(const CoilSweepBench& bench);

}  // namespace coilassay::synthetic

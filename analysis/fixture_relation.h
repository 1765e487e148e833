// What a fixture does to an impedance, and how its standards take it out: relations at one frequency.
#pragma once

#include <complex>
#include <optional>

namespace coilassay {

/// Standards at one frequency: as measured, and what they really are.
struct FixtureStandards {
  std::complex<double> open, short_circuit;           // measured, ohm
  std::optional<std::complex<double>> load;
  std::complex<double> short_ohm = 0;                 // the short's own impedance
  std::complex<double> open_siemens = 0;              // the open's own admittance
  std::complex<double> load_ohm = 0;                  // the load standard
};

/// Impedance of the part behind the fixture, from what was measured there.
///
/// Open and short (docs/formulas.md#fixture): the fixture is an impedance in series, then an admittance across the part.
///
///   Zx = (Zm - Zs)/(1 - (Zm - Zs)/(Zo - Zs)) for a short that is one; with the short's own impedance the series part is
///   Zo - d, d = ((Zo - Zs) + sqrt((Zo - Zs)² + 4 (Zo - Zs) Zss))/2, and a measured short comes out as Zss exactly.
///
/// Open, short and load: any linear fixture, Zx = Zss + (Zstd - Zss)(Zo - Zl)(Zm - Zs)/((Zl - Zs)(Zo - Zm)).
/// Infinite where Zm is the open; NaN where the standards are equal.
std::complex<double> behind_fixture(std::complex<double> measured, const FixtureStandards& standards);

/// S parameters of a two-port between analyser (its port 1) and part (its port 2).
struct TwoPort {
  std::complex<double> s11, s21, s12, s22;
  double reference_1_ohm = 50, reference_2_ohm = 50;
};

/// Impedance at port 2 from the one seen into port 1: G = (Gm - S11)/(S21 S12 + S22 (Gm - S11)).
std::complex<double> behind_two_port(std::complex<double> measured, const TwoPort& between);

/// Impedance at the end of a lossless line of this one-way delay, from the one at its beginning: G = Gm e^{+2 j w delay}. A
/// negative delay moves the plane towards the analyser.
std::complex<double> behind_line(std::complex<double> measured, double omega, double delay_s, double line_ohm);

}  // namespace coilassay

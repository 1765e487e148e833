// Circuits of a coil as functions of frequency: impedance, its derivatives, and where its imaginary part changes sign.
#pragma once

#include <array>
#include <complex>
#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace coilassay {

/// Which elements stand beside R, L and C.
///
/// Z = 1/(1/Zs + j w C + G + Y2),   w = 2 pi f,
/// Zs = R + j w L + (1+j) R_skin sqrt(f/f_ref) + R_rel (f/f_ref)^2/(1 + j w tau),
/// Y2 = j w C_2/(1 - (f/f_2)^2 + j D_2 f/f_2).
///
/// The skin term is causal: its internal inductance is in it. The relaxation is a part of the inductance, share k, with a
/// resistance across it (eddy currents that flow in a neighbour): tau = R_rel/(k L w_ref^2); its low end is R ~ f^2, its corner
/// 1/(2 pi tau). L is the inductance at low frequency, that share included; a circuit with k <= 1 is passive. Y2 is a second
/// tank in series across the terminals. docs/formulas.md#sweep.
struct CircuitFamily {
  bool parallel_loss = false;     // G
  bool skin = false;              // R_skin
  bool relaxation = false;        // R_rel, k
  bool second_resonance = false;  // C_2, f_2, D_2
  bool operator==(const CircuitFamily&) const = default;
};

/// "R L C", "R L C, parallel loss", "R L C, skin, parallel loss, second resonance" ...
std::string name(const CircuitFamily& family);

/// Every parameter is positive or zero; zero means that the element is not there (for k: never zero, at most 1).
enum class CircuitParameter : std::size_t {
  series_resistance,       // R, ohm
  inductance,              // L, H
  capacitance,             // C, F
  parallel_conductance,    // G, S
  skin_resistance,         // R_skin at the reference frequency, ohm
  relaxation_resistance,   // R_rel at the reference frequency by its low end, ohm
  relaxation_share,        // k: share of L that the relaxation takes away far above its corner
  second_capacitance,      // C_2, F
  second_frequency,        // f_2, Hz
  second_damping,          // D_2 = 1/Q_2
};
inline constexpr std::size_t kCircuitParameters = 10;

/// "R", "L", "C", "G", "R_skin", "R_rel", "k_rel", "C_2", "f_2", "D_2", as in the formulas above.
std::string_view name(CircuitParameter parameter);

/// The parameters a family has, in the order of the enumeration: R, L, C always.
std::vector<CircuitParameter> parameters_of(const CircuitFamily& family);

struct Circuit {
  CircuitFamily family;
  double reference_hz = 1;                          // > 0: what R_skin and R_rel refer to
  std::array<double, kCircuitParameters> values{};  // by CircuitParameter; those the family does not have are 0
  double& operator[](CircuitParameter p) { return values[static_cast<std::size_t>(p)]; }
  double operator[](CircuitParameter p) const { return values[static_cast<std::size_t>(p)]; }
};

/// Z at a frequency > 0, in ohm.
std::complex<double> impedance(const Circuit& circuit, double frequency_hz);

/// Z, and its derivatives: dz/dp of every parameter of the family in the order of parameters_of, and dz/df.
struct ImpedanceSlopes {
  std::complex<double> z;
  std::vector<std::complex<double>> by_parameter;
  std::complex<double> by_frequency;
};
ImpedanceSlopes impedance_slopes(const Circuit& circuit, double frequency_hz);

/// 1/(2 pi tau) of the relaxation in Hz; infinity without one.
double relaxation_corner_hz(const Circuit& circuit);

/// Derivatives of ln Z to one parameter each at one frequency, without allocation: the inner loop of the fit.
/// `slopes[i]` belongs to the i-th parameter of the family.
std::complex<double> impedance_and_log_slopes(const Circuit& circuit, double frequency_hz,
                                              std::span<std::complex<double>> slopes);

/// The lowest frequency in [low_hz, high_hz] where the imaginary part of Z goes from positive to negative, to about the last
/// digit. Nothing when it never does. Looked for on a grid of 200 points per decade, then by bisection.
std::optional<double> falling_zero_hz(const Circuit& circuit, double low_hz, double high_hz);

/// Its derivatives to the parameters of the family: -(d Im Z/dp)/(d Im Z/df).
std::vector<double> falling_zero_slopes(const Circuit& circuit, double zero_hz);

}  // namespace coilassay

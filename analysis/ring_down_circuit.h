// What hangs across the coil in a ring-down, as inputs with errors.
#pragma once

#include <cstddef>
#include <limits>
#include <span>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "analysis/budget.h"

namespace coilassay {

/// Stated values and defaults turned into error inputs; the same circuit serves one capacitor or several.
class RingDownCircuit {
 public:
  /// With `loads` the time base, probe and whatever is across; without, the time base alone.
  RingDownCircuit(const BenchSetup& bench, const PropagationOptions& options, bool loads);

  /// Adds a capacitor with its dissipation; returns its number.
  std::size_t add_capacitor(const CapacitorSetup& capacitor, const std::string& name);
  /// Any further independent error; returns its place among the inputs.
  std::size_t add(InputError input);

  const std::vector<InputError>& inputs() const { return inputs_; }
  std::vector<Correction> corrections() const;
  /// Place of a capacitor's value among the inputs.
  std::size_t capacitor_input(std::size_t capacitor) const { return capacitor_[capacitor]; }

  // Values for one draw of the inputs.
  double time_factor(std::span<const double> x) const { return 1 + x[timebase_]; }
  double total_capacitance(std::span<const double> x, std::size_t capacitor) const;
  double stray_capacitance(std::span<const double> x) const;   // probe and across, without the capacitor
  double conductance(std::span<const double> x) const;
  double dissipation(std::span<const double> x, std::size_t capacitor) const;

 private:
  static constexpr std::size_t kNone = std::numeric_limits<std::size_t>::max();
  std::size_t add_resistance(const std::string& source, const StatedValue& stated, const PropagationOptions& options);

  const PropagationOptions options_;
  std::vector<InputError> inputs_;
  std::size_t timebase_ = kNone, probe_c_ = kNone, probe_r_ = kNone, probe_g_ = kNone, across_r_ = kNone, across_c_ = kNone;
  std::vector<std::size_t> capacitor_, dissipation_;
};

/// L and R_s of the coil from natural frequency (rad/s) and decay rate (1/s) of the circuit:
/// w0^2 = (1 + R_s G)/(L C), 2 alpha = R_s/L + G/C + w0 D (docs/formulas.md#ring-down).
struct CoilOfDecay {
  double inductance_h, resistance_ohm;
};
CoilOfDecay coil_of_decay(double omega0, double alpha, double capacitance_f, double conductance_s, double dissipation);

}  // namespace coilassay

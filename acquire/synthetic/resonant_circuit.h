// A coil with a lossy capacitor and a resistance across it, left alone: solved exactly; a coil that saturates, by
// steps.
#pragma once

#include <cstddef>
#include <functional>

namespace coilassay::synthetic {

/// Coil current and capacitor voltage. The current flows into the coil's end whose voltage is counted.
struct CircuitState {
  double current_a = 0;
  double voltage_v = 0;
};

/// A coil L, R; across it a conductance G and a capacitor C in series with its loss resistance r:
///
///   L di/dt = v - R i,   C du/dt = -(i + G v),   v = u + r C du/dt
///
/// u is the voltage inside the capacitor, v the node's, which a probe sees. With k = 1 + r G:  v = (u - r i)/k, and the
/// characteristic polynomial is s^2 + 2 alpha s + w0^2 with
///
///   w0^2 = (1 + R G)/(k L C),   2 alpha = R/L + r/(k L) + G/(k C).
class ResonantCircuit {
 public:
  /// The loss resistance is the one a dissipation factor D has at w0 itself, r = D/(w0 C). So w0 is the positive root
  /// of L C w0^2 + L D G w0 = 1 + R G, and 2 alpha = R/L + G/C + w0 D but for relative terms of D G/(w0 C) and R G.
  /// Needs L, C > 0 and the others >= 0, all finite.
  ResonantCircuit(double inductance_h, double resistance_ohm, double capacitance_f, double conductance_s,
                  double dissipation);

  double omega0() const { return omega0_; }              // rad/s
  double alpha() const { return alpha_; }                // 1/s
  double damped_omega() const { return damped_omega_; }  // rad/s; 0 at and beyond critical damping
  double slowest_rate() const { return slow_; }          // 1/s, of the part that decays last
  double loss_resistance() const { return loss_ohm_; }   // ohm

  /// State at t >= 0 from a state at 0: one formula for ringing, critical and creeping circuits.
  CircuitState at(const CircuitState& start, double t_s) const;
  /// Voltage of the node.
  double node_voltage(const CircuitState& state) const { return (state.voltage_v - loss_ohm_ * state.current_a) / k_; }
  /// Largest magnitudes of current and node voltage from time 0 on, in closed form.
  CircuitState largest(const CircuitState& start) const;

  /// The same circuit with incremental inductance d(flux)/di = L/(1 + saturation i^2).
  ///
  /// Calls sample(n, state) for n = 0 ... count - 1 at time_at(n) >= 0, which must not fall. Taylor series of order 16,
  /// every step as long as its last terms allow; the record is good to 1e-9 of its amplitude.
  /// @return false when more than 2e7 steps would be needed; the record is then incomplete.
  bool step_saturating(const CircuitState& start, double saturation_per_a2, std::size_t count,
                       const std::function<double(std::size_t)>& time_at,
                       const std::function<void(std::size_t, const CircuitState&)>& sample) const;

 private:
  CircuitState slope(const CircuitState& state) const;
  double inductance_h_, resistance_ohm_, capacitance_f_, conductance_s_;
  double omega0_ = 0, loss_ohm_ = 0, k_ = 1, alpha_ = 0;
  double damped_omega_ = 0;  // of a ringing circuit
  double kappa_ = 0;         // 1/s: half the distance of the two rates of a creeping circuit
  double slow_ = 0;
};

}  // namespace coilassay::synthetic

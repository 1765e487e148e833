#include "acquire/synthetic/resonant_circuit.h"

#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>
#include <numbers>

namespace coilassay::synthetic {

ResonantCircuit::ResonantCircuit(double inductance_h, double resistance_ohm, double capacitance_f, double conductance_s,
                                 double dissipation)
    : inductance_h_(inductance_h),
      resistance_ohm_(resistance_ohm),
      capacitance_f_(capacitance_f),
      conductance_s_(conductance_s) {
  assert(inductance_h > 0 && capacitance_f > 0 && resistance_ohm >= 0 && conductance_s >= 0 && dissipation >= 0);
  const double lc = inductance_h * capacitance_f;
  const double ldg = inductance_h * dissipation * conductance_s;
  const double rg1 = 1 + resistance_ohm * conductance_s;
  omega0_ = 2 * rg1 / (ldg + std::sqrt(ldg * ldg + 4 * lc * rg1));
  loss_ohm_ = dissipation / (omega0_ * capacitance_f);
  k_ = 1 + loss_ohm_ * conductance_s;

  const double coil_rate = (resistance_ohm + loss_ohm_ / k_) / inductance_h;
  const double leak_rate = conductance_s / (k_ * capacitance_f);
  alpha_ = (coil_rate + leak_rate) / 2;
  // alpha^2 - w0^2 as a product of exact differences: no digits are lost near critical damping.
  const double half_difference = std::fabs(coil_rate - leak_rate) / 2;
  const double coupling = 1 / (k_ * std::sqrt(lc));
  const double square = (half_difference - coupling) * (half_difference + coupling);
  if (square < 0) {
    damped_omega_ = std::sqrt(-square);
    slow_ = alpha_;
  } else {
    kappa_ = std::sqrt(square);
    slow_ = omega0_ * omega0_ / (alpha_ + kappa_);  // product of the rates is w0^2
  }
}

CircuitState ResonantCircuit::slope(const CircuitState& state) const {
  const double v = node_voltage(state);
  return {(v - resistance_ohm_ * state.current_a) / inductance_h_,
          -(state.current_a + conductance_s_ * v) / capacitance_f_};
}

CircuitState ResonantCircuit::at(const CircuitState& start, double t_s) const {
  // x(t) = c x(0) + s (x'(0) + alpha x(0)), with c = e^(-alpha t) cos wt, s = e^(-alpha t) sin(wt)/w; beyond critical
  // damping their hyperbolic counterparts, written without a difference of large numbers.
  double c = 0, s = 0;
  if (damped_omega_ > 0) {
    const double envelope = std::exp(-alpha_ * t_s);
    c = envelope * std::cos(damped_omega_ * t_s);
    s = envelope * std::sin(damped_omega_ * t_s) / damped_omega_;
  } else {
    const double envelope = std::exp(-slow_ * t_s);
    const double less_one = std::expm1(-2 * kappa_ * t_s);
    c = envelope * (1 + less_one / 2);
    s = kappa_ > 0 ? envelope * less_one / (-2 * kappa_) : envelope * t_s;
  }
  const CircuitState change = slope(start);
  return {c * start.current_a + s * (change.current_a + alpha_ * start.current_a),
          c * start.voltage_v + s * (change.voltage_v + alpha_ * start.voltage_v)};
}

CircuitState ResonantCircuit::largest(const CircuitState& start) const {
  // The slope of a decaying oscillation is one too: x'(t) = c x'(0) + s (x''(0) + alpha x'(0)). Later extremes are
  // lower than the first, so time 0 and the first zero of the slope are all there is to look at.
  const CircuitState first = slope(start), second = slope(first);
  const auto first_extreme = [&](double d1, double d2) {
    const double b = d2 + alpha_ * d1;
    if (damped_omega_ > 0) {
      const double phase = std::atan2(-d1 * damped_omega_, b);
      return (phase > 0 ? phase : phase + std::numbers::pi) / damped_omega_;
    }
    if (kappa_ > 0) {
      const double ratio = -d1 * kappa_ / b;
      return ratio > 0 && ratio < 1 ? std::atanh(ratio) / kappa_ : 0.0;
    }
    return b != 0 ? std::max(-d1 / b, 0.0) : 0.0;
  };
  const double at_current = first_extreme(first.current_a, second.current_a);
  const double at_voltage = first_extreme(node_voltage(first), node_voltage(second));
  return {std::max(std::fabs(start.current_a), std::fabs(at(start, at_current).current_a)),
          std::max(std::fabs(node_voltage(start)), std::fabs(node_voltage(at(start, at_voltage))))};
}

namespace {

constexpr std::size_t kOrder = 16;
constexpr double kLastTerm = 1e-15;  // of the state: with some 1.3 steps a radian, 1e-9 after a million radians
constexpr std::size_t kMostSteps = 20'000'000;

using Series = std::array<double, kOrder + 1>;

double value_of(const Series& series, double t) {
  double sum = series[kOrder];
  for (std::size_t n = kOrder; n-- > 0;) sum = sum * t + series[n];
  return sum;
}

}  // namespace

bool ResonantCircuit::step_saturating(const CircuitState& start, double saturation_per_a2, std::size_t count,
                                      const std::function<double(std::size_t)>& time_at,
                                      const std::function<void(std::size_t, const CircuitState&)>& sample) const {
  // A step spans about a radian, or a decay time of the fastest part: a stiff circuit is known before it is stepped.
  const double fastest = std::max(omega0_, alpha_ + kappa_);
  if (count > 0 && !(time_at(count - 1) * fastest < static_cast<double>(kMostSteps))) return false;

  // Time in units of 1/w0 and current in units of voltage over sqrt(L/C): coefficients near one whatever the circuit.
  const double z = std::sqrt(inductance_h_ / capacitance_f_);
  const double drive = z / (inductance_h_ * omega0_);             // of di/dt, times w (1 + s i^2)
  const double charge = 1 / (z * capacitance_f_ * omega0_ * k_);  // of du/dt
  const double own_resistance = (resistance_ohm_ + loss_ohm_ / k_) / z;
  const double leak = conductance_s_ * z;
  const double saturation = saturation_per_a2 / (z * z);

  Series i{}, u{}, w{}, square{};
  double now = 0;  // in units of 1/w0
  i[0] = start.current_a * z;
  u[0] = start.voltage_v;
  const double gone = 1e-100 * std::max(std::fabs(i[0]), std::fabs(u[0]));
  std::size_t next = 0;
  for (std::size_t steps = 0; next < count; ++steps) {
    if (steps == kMostSteps || !std::isfinite(i[0]) || !std::isfinite(u[0])) return false;
    if (std::fabs(i[0]) <= gone && std::fabs(u[0]) <= gone) i[0] = u[0] = 0;  // before terms underflow
    for (std::size_t n = 0; n < kOrder; ++n) {
      w[n] = u[n] / k_ - own_resistance * i[n];
      square[n] = 0;
      for (std::size_t m = 0; m <= n; ++m) square[n] += i[m] * i[n - m];
      double bent = w[n];
      for (std::size_t m = 0; m <= n; ++m) bent += saturation * square[m] * w[n - m];
      const double order = static_cast<double>(n + 1);
      i[n + 1] = drive * bent / order;
      u[n + 1] = -charge * (i[n] + leak * u[n]) / order;
    }
    const auto size = [&](std::size_t n) { return std::max(std::fabs(i[n]), std::fabs(u[n])); };
    double length = INFINITY;  // at rest nothing changes any more
    for (const std::size_t n : {kOrder - 1, kOrder}) {
      if (size(n) > 0) length = std::min(length, std::pow(kLastTerm * size(0) / size(n), 1.0 / static_cast<double>(n)));
    }
    for (; next < count; ++next) {
      const double ahead = time_at(next) * omega0_ - now;
      if (ahead > length) break;
      sample(next, {value_of(i, ahead) / z, value_of(u, ahead)});
    }
    if (next == count) break;
    i[0] = value_of(i, length);
    u[0] = value_of(u, length);
    now += length;
  }
  return true;
}

}  // namespace coilassay::synthetic

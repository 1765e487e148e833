#include "fitting/circuit.h"

#include <cassert>
#include <cmath>
#include <limits>
#include <numbers>

namespace coilassay {

namespace {

using Complex = std::complex<double>;
using P = CircuitParameter;
constexpr double kTwoPi = 2 * std::numbers::pi;

// The library's complex product and quotient test for NaN and infinity each time; these do not.
Complex times(Complex a, Complex b) {
  return {a.real() * b.real() - a.imag() * b.imag(), a.real() * b.imag() + a.imag() * b.real()};
}
Complex inverse(Complex a) {
  const double d = 1 / (a.real() * a.real() + a.imag() * a.imag());
  return {a.real() * d, -a.imag() * d};
}
Complex turned(Complex a) { return {-a.imag(), a.real()}; }   // j a

/// The pieces every quantity is made of.
struct Pieces {
  double w = 0, root = 0, square = 0, a = 0;   // w, sqrt(f/f_ref), (f/f_ref)^2, w tau
  Complex relaxed, zs, n2, y2, y, z;           // 1/(1 + j a), series arm, 1 - x^2 + j D x, second tank, both
  double x = 0;                                // f/f_2
};

Pieces pieces_of(const Circuit& c, double f) {
  Pieces p;
  p.w = kTwoPi * f;
  p.zs = {c[P::series_resistance], p.w * c[P::inductance]};
  const double ratio = f / c.reference_hz;
  if (c.family.skin) {
    p.root = std::sqrt(ratio);
    p.zs += Complex(1, 1) * (c[P::skin_resistance] * p.root);
  }
  if (c.family.relaxation) {
    const double w_ref = kTwoPi * c.reference_hz;
    p.square = ratio * ratio;
    p.a = p.w * c[P::relaxation_resistance] / (c[P::relaxation_share] * c[P::inductance] * w_ref * w_ref);
    p.relaxed = inverse({1, p.a});
    p.zs += c[P::relaxation_resistance] * p.square * p.relaxed;
  }
  p.y = inverse(p.zs) + Complex(c[P::parallel_conductance], p.w * c[P::capacitance]);
  if (c.family.second_resonance) {
    p.x = f / c[P::second_frequency];
    p.n2 = {1 - p.x * p.x, c[P::second_damping] * p.x};
    p.y2 = p.w * c[P::second_capacitance] * turned(inverse(p.n2));
    p.y += p.y2;
  }
  p.z = inverse(p.y);
  return p;
}

/// dy2/dx at fixed w in front.
Complex second_by_x(const Circuit& c, const Pieces& p) {
  return -times(times(p.y2, inverse(p.n2)), Complex(-2 * p.x, c[P::second_damping]));
}

}  // namespace

std::string name(const CircuitFamily& family) {
  std::string text = "R L C";
  if (family.skin) text += ", skin";
  if (family.relaxation) text += ", relaxation";
  if (family.parallel_loss) text += ", parallel loss";
  if (family.second_resonance) text += ", second resonance";
  return text;
}

std::string_view name(CircuitParameter parameter) {
  static constexpr std::array<std::string_view, kCircuitParameters> names = {"R",     "L",     "C",   "G",   "R_skin",
                                                                             "R_rel", "k_rel", "C_2", "f_2", "D_2"};
  return names[static_cast<std::size_t>(parameter)];
}

std::vector<CircuitParameter> parameters_of(const CircuitFamily& family) {
  std::vector<CircuitParameter> list = {P::series_resistance, P::inductance, P::capacitance};
  if (family.parallel_loss) list.push_back(P::parallel_conductance);
  if (family.skin) list.push_back(P::skin_resistance);
  if (family.relaxation) list.insert(list.end(), {P::relaxation_resistance, P::relaxation_share});
  if (family.second_resonance) list.insert(list.end(), {P::second_capacitance, P::second_frequency, P::second_damping});
  return list;
}

std::complex<double> impedance(const Circuit& circuit, double frequency_hz) { return pieces_of(circuit, frequency_hz).z; }

std::complex<double> impedance_and_log_slopes(const Circuit& c, double f, std::span<std::complex<double>> slopes) {
  const Pieces p = pieces_of(c, f);
  // d ln Z = -Z dY, and d(1/Zs) = -dZs/Zs^2.
  const Complex over = inverse(p.zs);
  const Complex series = times(p.z, times(over, over));
  std::size_t i = 0;
  slopes[i++] = series;
  const Complex relaxed2 = c.family.relaxation ? times(p.relaxed, p.relaxed) : Complex();
  const double share = c[P::relaxation_share];
  Complex by_l(0, p.w);
  if (c.family.relaxation) by_l += turned(share * p.w * p.a * p.a * relaxed2);
  slopes[i++] = times(series, by_l);
  slopes[i++] = -p.w * turned(p.z);
  if (c.family.parallel_loss) slopes[i++] = -p.z;
  if (c.family.skin) slopes[i++] = p.root * (series + turned(series));
  if (c.family.relaxation) {
    slopes[i++] = p.square * times(series, relaxed2);
    slopes[i++] = c[P::inductance] * p.w * p.a * p.a * turned(times(series, relaxed2));
  }
  if (c.family.second_resonance) {
    slopes[i++] = -p.w * times(p.z, turned(inverse(p.n2)));
    slopes[i++] = times(p.z, second_by_x(c, p)) * (p.x / c[P::second_frequency]);
    slopes[i++] = p.x * turned(times(times(p.z, p.y2), inverse(p.n2)));
  }
  return p.z;
}

ImpedanceSlopes impedance_slopes(const Circuit& c, double f) {
  ImpedanceSlopes result;
  std::array<Complex, kCircuitParameters> log_slopes;
  result.z = impedance_and_log_slopes(c, f, log_slopes);
  const std::size_t count = parameters_of(c.family).size();
  for (std::size_t i = 0; i < count; ++i) result.by_parameter.push_back(result.z * log_slopes[i]);

  const Pieces p = pieces_of(c, f);
  Complex series(0, kTwoPi * c[P::inductance]);
  if (c.family.skin) series += Complex(0.5, 0.5) * (c[P::skin_resistance] * p.root / f);
  if (c.family.relaxation) {
    const double low_end = c[P::relaxation_resistance] * p.square / f;
    series += low_end * (p.relaxed + p.relaxed * p.relaxed);
  }
  Complex y_slope = -series / (p.zs * p.zs) + Complex(0, kTwoPi * c[P::capacitance]);
  if (c.family.second_resonance) y_slope += (p.y2 + second_by_x(c, p) * p.x) / f;
  result.by_frequency = -p.z * p.z * y_slope;
  return result;
}

double relaxation_corner_hz(const Circuit& c) {
  if (!c.family.relaxation) return std::numeric_limits<double>::infinity();
  const double w_ref = kTwoPi * c.reference_hz;
  return c[P::relaxation_share] * c[P::inductance] * w_ref * w_ref / (kTwoPi * c[P::relaxation_resistance]);
}

std::optional<double> falling_zero_hz(const Circuit& circuit, double low_hz, double high_hz) {
  assert(low_hz > 0 && high_hz >= low_hz);
  // The sign of Im Z is that of -Im Y, which stays finite where a lossless circuit has a pole.
  const auto positive = [&](double f) { return pieces_of(circuit, f).y.imag() < 0; };
  const double step = std::pow(10, 1.0 / 200);
  bool before = positive(low_hz);
  for (double a = low_hz; a < high_hz;) {
    double b = std::fmin(a * step, high_hz);
    const bool now = positive(b);
    if (before && !now) {
      double left = a;
      for (int i = 0; i < 60 && b > left; ++i) {
        const double middle = std::sqrt(left * b);
        if (!(middle > left && middle < b)) break;
        (positive(middle) ? left : b) = middle;
      }
      return std::sqrt(left * b);
    }
    before = now;
    a = b;
  }
  return std::nullopt;
}

std::vector<double> falling_zero_slopes(const Circuit& circuit, double zero_hz) {
  const ImpedanceSlopes at = impedance_slopes(circuit, zero_hz);
  std::vector<double> slopes;
  for (const Complex& dz : at.by_parameter) slopes.push_back(-dz.imag() / at.by_frequency.imag());
  return slopes;
}

}  // namespace coilassay

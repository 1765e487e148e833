#include "fitting/circuit_equations.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <cassert>
#include <cmath>
#include <numeric>

namespace coilassay {

namespace {

using Complex = std::complex<double>;

/// ln q; near 1 by its series, which costs a fifth of the library's logarithm and arctangent.
Complex logarithm(Complex q) {
  const double x = q.real() - 1, y = q.imag();
  if (x * x + y * y > 1e-3) return {0.5 * std::log(q.real() * q.real() + y * y), std::atan2(y, q.real())};
  // ln(1+e) = 2 artanh(e/(2+e)); with |e| < 0.032 the ninth power of e/2 is below rounding.
  const double d = 1 / ((2 + x) * (2 + x) + y * y);
  const double a = (x * (2 + x) + y * y) * d, b = 2 * y * d;
  const double a2 = a * a - b * b, b2 = 2 * a * b;
  double s = 1.0 / 9, t = 0;
  for (const double c : {1.0 / 7, 1.0 / 5, 1.0 / 3, 1.0}) {
    const double next = s * a2 - t * b2 + c;
    t = s * b2 + t * a2;
    s = next;
  }
  return {2 * (a * s - b * t), 2 * (a * t + b * s)};
}

constexpr double kLeastSize = 1e-60;   // of z: smaller, and larger than its inverse, is no measurement, and its square no number

double one_of(const std::vector<double>& list, std::size_t i) { return list.size() == 1 ? list[0] : list[i]; }

}  // namespace

std::vector<std::size_t> usable_points(const CircuitData& data) {
  assert(data.z.size() == data.size() && (data.u.size() == 1 || data.u.size() == data.size()));
  std::vector<std::size_t> points;
  for (std::size_t i = 0; i < data.size(); ++i) {
    const double size = std::abs(data.z[i]);
    if (size > kLeastSize && size < 1 / kLeastSize && one_of(data.u, i) > 0 && std::isfinite(one_of(data.u, i))) points.push_back(i);
  }
  std::stable_sort(points.begin(), points.end(),
                   [&](std::size_t a, std::size_t b) { return data.frequency_hz[a] < data.frequency_hz[b]; });
  return points;
}

CircuitEquations::CircuitEquations(const CircuitData& data, std::span<const std::size_t> points, bool ratio)
    : ratio_(ratio || data.errors == SweepErrors::ratio), reference_(data.reference_ohm) {
  rows_.reserve(points.size());
  for (const std::size_t i : points) {
    Row row;
    const Complex z = data.z[i];
    row.f = data.frequency_hz[i];
    double u = one_of(data.u, i);
    row.w22 = 1 / u;
    if (data.errors == SweepErrors::ratio) {
      if (!data.u_phase.empty()) row.w22 = 1 / one_of(data.u_phase, i);   // 0 for an infinite error
      if (!data.correlation.empty() && row.w22 > 0) {
        const double r = one_of(data.correlation, i), rest = std::sqrt(1 - r * r);
        row.w21 = -r / (u * rest);
        row.w22 /= rest;
      }
    } else if (ratio) {
      u *= std::norm(z + reference_) / (2 * reference_ * std::abs(z));   // |dS/d ln z| = 2 z_0 |z|/|z + z_0|^2
      u = std::hypot(u, 1e-9);
      row.w22 = 1 / u;
    }
    row.w11 = 1 / u;
    row.target = ratio_ ? 1.0 / z : (z - reference_) / (z + reference_);
    rows_.push_back(row);
  }
}

std::size_t CircuitEquations::numbers() const {
  std::size_t count = 0;
  for (const Row& row : rows_) count += (row.w11 > 0 ? 1U : 0U) + (row.w22 > 0 ? 1U : 0U);
  return count;
}

double CircuitEquations::rounding() const {
  constexpr double kDigits = 4e-15;   // of ln z and S, after some ten operations
  double chi = 0;
  for (const Row& row : rows_) chi += kDigits * kDigits * (row.w11 * row.w11 + row.w22 * row.w22);
  return chi;
}

void CircuitEquations::weigh(std::span<const double> weights) {
  assert(weights.size() == rows_.size());
  for (std::size_t i = 0; i < rows_.size(); ++i) rows_[i].weight = weights[i];
}

std::complex<double> CircuitEquations::raw_residual(const Row& row, Complex z) const {
  const Complex d = ratio_ ? logarithm({z.real() * row.target.real() - z.imag() * row.target.imag(),
                                        z.real() * row.target.imag() + z.imag() * row.target.real()})
                           : (z - reference_) / (z + reference_) - row.target;
  return {row.w11 * d.real(), row.w21 * d.real() + row.w22 * d.imag()};
}

std::complex<double> CircuitEquations::residual(const Circuit& circuit, std::size_t row) const {
  return raw_residual(rows_[row], impedance(circuit, rows_[row].f));
}

std::complex<double> CircuitEquations::whitened(std::size_t row, Complex error) const {
  const Row& at = rows_[row];
  return {at.w11 * error.real(), at.w21 * error.real() + at.w22 * error.imag()};
}

std::complex<double> CircuitEquations::unwhitened(std::size_t row, Complex residual) const {
  const Row& at = rows_[row];
  const double real = residual.real() / at.w11;
  return {real, at.w22 > 0 ? (residual.imag() - at.w21 * real) / at.w22 : 0};
}

double CircuitEquations::chi_square(const Circuit& circuit) const {
  double chi = 0;
  for (const Row& row : rows_) chi += row.weight * std::norm(raw_residual(row, impedance(circuit, row.f)));
  return chi;
}

/// With a number of parameters that the compiler knows, the sums stay in registers.
template <std::size_t n>
void CircuitEquations::look_at(const Circuit& circuit, std::span<const double> unit, CircuitNormal& result) const {
  std::array<double, n> re{}, im{}, gradient{};
  std::array<std::array<double, n>, n> normal{};
  std::array<Complex, kCircuitParameters> slopes;
  result.chi = 0;
  for (const Row& row : rows_) {
    const Complex z = impedance_and_log_slopes(circuit, row.f, slopes);
    const Complex r = raw_residual(row, z);
    result.chi += row.weight * std::norm(r);
    double m_re = 1, m_im = 0;
    if (!ratio_) {   // dS/d ln z = 2 z_0 z/(z + z_0)^2
      const Complex m = 2 * reference_ * z / ((z + reference_) * (z + reference_));
      m_re = m.real();
      m_im = m.imag();
    }
    const double root = row.weight == 1 ? 1 : std::sqrt(row.weight);
    const double w11 = root * row.w11, w21 = root * row.w21, w22 = root * row.w22;
    for (std::size_t i = 0; i < n; ++i) {
      const double a = unit[i] * (slopes[i].real() * m_re - slopes[i].imag() * m_im);
      const double b = unit[i] * (slopes[i].real() * m_im + slopes[i].imag() * m_re);
      re[i] = w11 * a;
      im[i] = w21 * a + w22 * b;
    }
    for (std::size_t i = 0; i < n; ++i) {
      gradient[i] += root * (re[i] * r.real() + im[i] * r.imag());
      for (std::size_t j = 0; j <= i; ++j) normal[i][j] += re[i] * re[j] + im[i] * im[j];
    }
  }
  result.gradient.setZero();
  result.normal.setZero();
  for (std::size_t i = 0; i < n; ++i) {
    result.gradient[static_cast<Eigen::Index>(i)] = gradient[i];
    for (std::size_t j = 0; j <= i; ++j) {
      const auto a = static_cast<Eigen::Index>(i), b = static_cast<Eigen::Index>(j);
      result.normal(a, b) = result.normal(b, a) = normal[i][j];
    }
  }
}

void CircuitEquations::look(const Circuit& circuit, std::span<const double> unit, CircuitNormal& result) const {
  switch (unit.size()) {
    case 3: return look_at<3>(circuit, unit, result);
    case 4: return look_at<4>(circuit, unit, result);
    case 5: return look_at<5>(circuit, unit, result);
    case 6: return look_at<6>(circuit, unit, result);
    case 7: return look_at<7>(circuit, unit, result);
    case 8: return look_at<8>(circuit, unit, result);
    case 9: return look_at<9>(circuit, unit, result);
    default: assert(unit.size() == kCircuitParameters); return look_at<kCircuitParameters>(circuit, unit, result);
  }
}

namespace {

/// A sweep may show L far better than what is left of it above the corner of a relaxation, or the other way round; in the wrong
/// coordinates the valley is bent, and a descent crawls. The others are the logarithms of (1-k)L, kL and tau in place of L, k and R_rel.
class Coordinates {
 public:
  Coordinates(const Circuit& circuit, HeldParameters held, const CircuitMatrix& normal) {
    using P = CircuitParameter;
    if (!circuit.family.relaxation || circuit[P::relaxation_share] > 0.99 || held != 0) return;
    const auto order = parameters_of(circuit.family);
    for (std::size_t i = 0; i < order.size(); ++i) {
      if (order[i] == P::inductance) inductance_ = static_cast<Eigen::Index>(i);
      if (order[i] == P::relaxation_resistance) resistance_ = static_cast<Eigen::Index>(i);
      if (order[i] == P::relaxation_share) share_ = static_cast<Eigen::Index>(i);
    }
    // Variances of ln L and of ln (1-k)L, by the inverse of the normal matrix.
    const double k = circuit[P::relaxation_share], weight = -k / (1 - k);
    CircuitMatrix regular = normal;
    for (std::size_t i = 0; i < kCircuitParameters; ++i) {
      const auto at = static_cast<Eigen::Index>(i);
      regular(at, at) = i < order.size() ? regular(at, at) * (1 + 1e-12) + 1e-300 : 1;
    }
    const Eigen::LDLT<CircuitMatrix> solver(regular);
    CircuitVector whole = CircuitVector::Zero(), rest = CircuitVector::Zero();
    whole[inductance_] = rest[inductance_] = 1;
    rest[share_] = weight;
    other_ = rest.dot(solver.solve(rest)) < whole.dot(solver.solve(whole));
    if (!other_) return;
    // Row by row: ln L, ln R_rel, ln k by ln (1-k)L, ln tau, ln kL, which take their places.
    turn_.setIdentity();
    turn_(inductance_, inductance_) = 1 - k;
    turn_(inductance_, share_) = k;
    turn_(resistance_, share_) = 1;
    turn_(share_, share_) = 1 - k;
    turn_(share_, inductance_) = k - 1;
  }

  void turn(CircuitMatrix& normal, CircuitVector& gradient) const {
    if (!other_) return;
    normal = turn_.transpose() * normal * turn_;
    gradient = turn_.transpose() * gradient;
  }

  /// The circuit one step further.
  Circuit stepped(const Circuit& from, const CircuitVector& step, HeldParameters held) const {
    using P = CircuitParameter;
    constexpr double kLargestStep = 3;   // in a logarithm: a factor of 20
    const auto order = parameters_of(from.family);
    std::array<double, kCircuitParameters> factor{};
    Circuit to = from;
    for (std::size_t i = 0; i < order.size(); ++i) {
      factor[i] = std::exp(std::clamp(step[static_cast<Eigen::Index>(i)], -kLargestStep, kLargestStep));
      if ((held >> i & 1U) == 0) to[order[i]] = std::clamp(to[order[i]] * factor[i], 1e-60, 1e60);
      if (order[i] == P::relaxation_share) to[order[i]] = std::min(to[order[i]], 1.0);
    }
    if (!other_) return to;
    const auto at = [&](Eigen::Index i) { return factor[static_cast<std::size_t>(i)]; };
    const double l = from[P::inductance], k = from[P::relaxation_share];
    const double rest = (1 - k) * l * at(inductance_), share = k * l * at(share_);
    to[P::inductance] = rest + share;
    to[P::relaxation_share] = share / (rest + share);
    to[P::relaxation_resistance] = from[P::relaxation_resistance] * at(share_) * at(resistance_);
    return to;
  }

 private:
  bool other_ = false;
  Eigen::Index inductance_ = 1, resistance_ = 0, share_ = 0;
  CircuitMatrix turn_;
};

}  // namespace

SettledCircuit descend(const CircuitEquations& equations, const Circuit& start, HeldParameters held, int most_iterations,
                       double settled, double damping) {
  const auto order = parameters_of(start.family);
  const std::size_t n = order.size();
  SettledCircuit best;
  best.circuit = start;
  std::array<double, kCircuitParameters> unit{};
  const auto units_of = [&](const Circuit& c) {
    for (std::size_t i = 0; i < n; ++i) unit[i] = (held >> i & 1U) != 0 ? 0 : c[order[i]];
    return std::span<const double>(unit).first(n);
  };
  equations.look(start, units_of(start), best.last);
  best.chi = best.last.chi;
  if (!std::isfinite(best.chi)) return best;
  best.stop = FitStop::max_iterations;
  const auto rows = static_cast<double>(equations.size());
  const double rounding = equations.rounding();
  CircuitNormal trial_normal;
  for (; best.iterations < most_iterations; ++best.iterations) {
    CircuitMatrix damped = best.last.normal;
    CircuitVector gradient = best.last.gradient;
    const Coordinates coordinates(best.circuit, held, best.last.normal);
    coordinates.turn(damped, gradient);
    for (std::size_t k = 0; k < kCircuitParameters; ++k) {
      const auto i = static_cast<Eigen::Index>(k);
      const bool stuck = k < n && order[k] == CircuitParameter::relaxation_share &&
                         best.circuit[order[k]] >= 1 && gradient[i] < 0;
      if (k >= n || (held >> k & 1U) != 0 || stuck) {
        damped.row(i).setZero();
        damped.col(i).setZero();
        damped(i, i) = 1;
        gradient[i] = 0;
      } else {
        // The addition keeps the matrix regular where a parameter is not seen at all.
        damped(i, i) += damping * damped(i, i) + 1e-14 * best.chi + 1e-300;
      }
    }
    CircuitVector step = -damped.ldlt().solve(gradient);
    if (!step.allFinite()) {
      best.stop = FitStop::rank_deficient;
      break;
    }
    const double gain = -gradient.dot(step);
    const bool small = gain < std::fmax(settled * best.chi / rows, rounding);
    if (small && damping <= 1e-3) {   // not worth another look; what is left of chi-square is known
      best.stop = FitStop::converged;
      break;
    }
    const Circuit trial = coordinates.stepped(best.circuit, step, held);
    equations.look(trial, units_of(trial), trial_normal);
    if (trial_normal.chi <= best.chi) {
      best.circuit = trial;
      best.chi = trial_normal.chi;
      best.last = trial_normal;
      damping = std::max(damping * 0.1, 1e-12);
    } else {
      if (small) {   // rounding: nothing left to gain
        best.stop = FitStop::converged;
        break;
      }
      damping = std::max(damping, 1e-6) * 8;
      if (damping > 1e12) break;
    }
  }
  return best;
}

}  // namespace coilassay

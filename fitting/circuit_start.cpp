#include "fitting/circuit_start.h"

#include <Eigen/QR>
#include <algorithm>
#include <cmath>
#include <numbers>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
using P = CircuitParameter;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr std::size_t kStartPoints = 51;
constexpr int kStartIterations = 25;
constexpr double kStartSettled = 1e-2;

struct Thinned {
  std::vector<double> f;
  std::vector<Complex> z;
};

Circuit simple_circuit(double r, double l, double c, double reference_hz) {
  Circuit circuit;
  circuit.reference_hz = reference_hz;
  circuit[P::series_resistance] = r;
  circuit[P::inductance] = l;
  circuit[P::capacitance] = c;
  return circuit;
}

/// Sanathanan and Koerner's iteration for (b0 + b1 s)/(1 + a1 s + a2 s^2): R, L, C, G in one linear problem, each round
/// weighted by the denominator of the round before. Nothing where the result is no circuit.
std::optional<Circuit> sanathanan_koerner(const Thinned& data, double reference_hz) {
  const auto n = static_cast<Eigen::Index>(data.f.size());
  Eigen::MatrixXd a(2 * n, 4);
  Eigen::VectorXd y(2 * n);
  Eigen::Vector4d x = Eigen::Vector4d::Zero();
  const double scale = std::sqrt(data.f.front() * data.f.back());
  for (int round = 0; round < 8; ++round) {
    for (Eigen::Index i = 0; i < n; ++i) {
      const auto k = static_cast<std::size_t>(i);
      const Complex s(0, data.f[k] / scale), z = data.z[k];
      const Complex denominator = round == 0 ? Complex(1) : 1.0 + x[2] * s + x[3] * s * s;
      const double weight = 1 / std::fmax(std::abs(denominator) * std::abs(z), 1e-300);
      const Complex row[] = {1, s, -z * s, -z * s * s};
      for (Eigen::Index j = 0; j < 4; ++j) {
        a(i, j) = weight * row[j].real();
        a(n + i, j) = weight * row[j].imag();
      }
      y[i] = weight * z.real();
      y[n + i] = weight * z.imag();
    }
    const Eigen::RowVector4d size = a.colwise().norm().cwiseMax(1e-300);
    const Eigen::MatrixXd even = a * size.cwiseInverse().asDiagonal();
    Eigen::Vector4d next = even.householderQr().solve(y);
    next = next.cwiseQuotient(size.transpose());
    if (!next.allFinite()) break;
    const double change = (next - x).norm();
    x = next;
    if (change < 1e-6 * x.norm()) break;
  }
  const double w = kTwoPi * scale, b0 = x[0], b1 = x[1] / w, a1 = x[2] / w, a2 = x[3] / (w * w);
  const double c = a2 / b1, g = (a1 - b0 * c) / b1, rest = 1 - b0 * g;
  if (!(b1 > 0) || !std::isfinite(c) || !std::isfinite(g)) return std::nullopt;
  const double l = rest > 0 ? b1 / rest : b1, least = 1e-4 * w * l;
  Circuit circuit = simple_circuit(b0 > 0 ? (rest > 0 ? b0 / rest : b0) : least, l, c > 0 ? c : 1e-4 / (w * w * l), reference_hz);
  circuit.family.parallel_loss = true;
  circuit[P::parallel_conductance] = g > 0 ? g : 1e-4 / (w * l);
  return circuit;
}

/// Starts read off the data: L where they are inductive, C from the resonance, from beyond it, or a guess.
std::vector<Circuit> read_off(const Thinned& data, double reference_hz) {
  std::vector<double> inductances;
  double crossing = 0, previous = 0;
  for (std::size_t i = 0; i < data.f.size(); ++i) {
    const double x = data.z[i].imag();
    if (x > 0 && std::arg(data.z[i]) > 0.35) inductances.push_back(x / (kTwoPi * data.f[i]));
    if (crossing == 0 && i > 0 && previous > 0 && x <= 0) crossing = std::sqrt(data.f[i - 1] * data.f[i]);
    previous = x;
  }
  const double first_x = data.z.front().imag(), top = data.f.back();
  double l = inductances.empty() ? std::fabs(first_x) / (kTwoPi * data.f.front()) : median(inductances);
  if (!(l > 0)) l = std::abs(data.z.back()) / (kTwoPi * top);
  double r = data.z.front().real();
  if (!(r > 0)) r = 1e-3 * std::abs(data.z.front());
  std::vector<double> capacitances;
  const auto resonant = [&](double f) { capacitances.push_back(1 / (l * kTwoPi * f * kTwoPi * f)); };
  if (crossing > 0) resonant(crossing);
  const auto largest = std::max_element(data.z.begin(), data.z.end(), [](Complex a, Complex b) { return std::abs(a) < std::abs(b); });
  const auto peak = static_cast<std::size_t>(largest - data.z.begin());
  if (peak > 0 && peak + 1 < data.f.size()) resonant(data.f[peak]);
  for (const double factor : {1.5, 4.5, 15.0}) resonant(factor * top);
  const double c_top = (1.0 / data.z.back()).imag() / (kTwoPi * top);
  if (c_top > 0) capacitances.push_back(c_top);
  std::vector<Circuit> list;
  for (const double c : capacitances) list.push_back(simple_circuit(r, l, c, reference_hz));
  return list;
}

/// Keeps the better of `best` and where `start` leads.
void follow(const CircuitEquations& equations, const Circuit& start, SettledCircuit& best) {
  const SettledCircuit next = descend(equations, start, 0, kStartIterations, kStartSettled);
  if (next.chi < best.chi) best = next;
}

/// Series resistance that the circuit has near its reference frequency or its resonance, whichever is lower.
double resistance_scale(const Circuit& c) {
  const double resonance = 1 / (kTwoPi * std::sqrt(c[P::inductance] * c[P::capacitance]));
  const double f = std::fmin(c.reference_hz, 0.5 * resonance), wl = kTwoPi * f * c[P::inductance];
  return c[P::series_resistance] + wl * wl * c[P::parallel_conductance] + 1e-6 * wl;
}

std::vector<Circuit> with_parallel_loss(const Circuit& from, double largest_z) {
  std::vector<Circuit> list;
  for (const double factor : {0.03, 0.3, 1.0}) {
    Circuit c = from;
    c.family.parallel_loss = true;
    c[P::parallel_conductance] = factor / largest_z;
    list.push_back(c);
  }
  return list;
}

std::vector<Circuit> with_skin(const Circuit& from) {
  std::vector<Circuit> list;
  for (const double factor : {0.05, 0.5, 3.0}) {
    Circuit c = from;
    c.family.skin = true;
    c[P::skin_resistance] = factor * resistance_scale(from);
    c[P::series_resistance] *= factor > 1 ? 0.3 : 1 - 0.3 * factor;
    list.push_back(c);
  }
  return list;
}

std::vector<Circuit> with_relaxation(const Circuit& from, double largest_z) {
  std::vector<Circuit> list;
  const double w_ref = kTwoPi * from.reference_hz, x = w_ref * from[P::inductance];
  // Corners below, at and above the middle of the sweep, each with small and large shares; R_rel = k L w_ref^2/w_corner.
  for (const double corner : {0.1, 1.0, 10.0}) {
    for (const double share : {0.02, 0.2}) {
      Circuit c = from;
      c.family.relaxation = true;
      c[P::relaxation_share] = share;
      c[P::relaxation_resistance] = share * x / corner;
      list.push_back(c);
    }
  }
  // And all of L with a resistance across it, as a parallel loss.
  for (const double factor : {0.03, 0.3, 1.0}) {
    Circuit c = from;
    c.family.relaxation = true;
    c[P::relaxation_share] = 1;
    c[P::relaxation_resistance] = x * x * factor / largest_z;
    list.push_back(c);
  }
  return list;
}

std::vector<Circuit> with_second_resonance(const Circuit& from, const CircuitEquations& equations) {
  // Where the residuals are largest, and beyond the first resonance.
  double worst = 0, at = equations.frequency_hz(equations.size() - 1);
  for (std::size_t i = 0; i < equations.size(); ++i) {
    const double size = std::abs(equations.residual(from, i));
    if (size > worst) worst = size, at = equations.frequency_hz(i);
  }
  const double first = 1 / (kTwoPi * std::sqrt(from[P::inductance] * from[P::capacitance]));
  std::vector<Circuit> list;
  for (const double f : {at, at * 0.9, at * 1.1, 2 * first, 4 * first}) {
    for (const double share : {0.05, 0.5}) {
      Circuit c = from;
      c.family.second_resonance = true;
      c[P::second_capacitance] = share * from[P::capacitance];
      c[P::second_frequency] = f;
      c[P::second_damping] = 0.03;
      c[P::capacitance] *= 1 - share;
      list.push_back(c);
    }
  }
  return list;
}

Thinned thinned_of(const CircuitData& data, std::span<const std::size_t> points) {
  Thinned thinned;
  bool phases = data.errors != SweepErrors::ratio || data.u_phase.empty();
  for (const double u : data.u_phase) phases = phases || std::isfinite(u);
  for (const std::size_t i : points) {
    thinned.f.push_back(data.frequency_hz[i]);
    thinned.z.push_back(data.z[i]);
  }
  if (phases) return thinned;
  const std::size_t n = thinned.f.size();
  for (std::size_t i = 0; i < n; ++i) {
    const std::size_t a = i == 0 ? 0 : i - 1, b = std::min(i + 1, n - 1);
    const double slope = std::log(std::abs(data.z[points[b]] / data.z[points[a]])) / std::log(thinned.f[b] / thinned.f[a]);
    thinned.z[i] = std::polar(std::abs(thinned.z[i]), std::clamp(slope, -1.0, 1.0) * std::numbers::pi / 2);
  }
  return thinned;
}

}  // namespace

std::vector<std::size_t> thin_points(std::span<const std::size_t> points, std::size_t most) {
  if (points.size() <= most) return {points.begin(), points.end()};
  std::vector<std::size_t> thin;
  for (std::size_t k = 0; k < most; ++k) thin.push_back(points[k * (points.size() - 1) / (most - 1)]);
  return thin;
}

Circuit extend_circuit(const CircuitEquations& equations, const Circuit& smaller, const CircuitFamily& family) {
  SettledCircuit best;
  best.circuit = smaller;
  const auto grow = [&](const std::vector<Circuit>& starts) {
    best.chi = HUGE_VAL;
    for (const Circuit& start : starts) follow(equations, start, best);
  };
  if (family.skin && !best.circuit.family.skin) grow(with_skin(best.circuit));
  double largest = 0;
  for (std::size_t i = 0; i < equations.size(); ++i) {
    largest = std::fmax(largest, std::abs(impedance(best.circuit, equations.frequency_hz(i))));
  }
  if (family.relaxation && !best.circuit.family.relaxation) grow(with_relaxation(best.circuit, largest));
  if (family.parallel_loss && !best.circuit.family.parallel_loss) grow(with_parallel_loss(best.circuit, largest));
  if (family.second_resonance && !best.circuit.family.second_resonance) grow(with_second_resonance(best.circuit, equations));
  return best.circuit;
}

std::optional<Circuit> start_circuit(const CircuitData& data, std::span<const std::size_t> points, const CircuitFamily& family,
                                     double reference_hz) {
  const auto few = thin_points(points, kStartPoints);
  const Thinned thinned = thinned_of(data, few);
  const bool inductive = std::any_of(thinned.z.begin(), thinned.z.end(), [](Complex z) { return z.imag() > 0; });
  if (!inductive) return std::nullopt;
  const CircuitEquations equations(data, few, true);
  SettledCircuit best;
  const auto linear = sanathanan_koerner(thinned, reference_hz);
  for (const Circuit& start : read_off(thinned, reference_hz)) follow(equations, start, best);
  if (linear) {
    Circuit start = *linear;
    start.family.parallel_loss = false;
    start[P::parallel_conductance] = 0;
    follow(equations, start, best);
  }
  if (family.parallel_loss && linear) {   // it holds the loss already: another branch, kept where it leads further
    SettledCircuit other;
    follow(equations, *linear, other);
    CircuitFamily loss;
    loss.parallel_loss = true;
    Circuit grown = extend_circuit(equations, best.circuit, loss);
    if (other.chi < equations.chi_square(grown)) grown = other.circuit;
    best.circuit = grown;
  }
  return extend_circuit(equations, best.circuit, family);
}

}  // namespace coilassay

#include "acquire/synthetic/coupled_windings.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <utility>

#include "base/random.h"

namespace coilassay::synthetic {

namespace {

using Complex = std::complex<double>;

constexpr std::size_t kMostRows = 6;   // currents and voltages of three windings
using Column = std::array<Complex, kMostRows>;
struct Matrix {
  std::array<std::array<Complex, kMostRows>, kMostRows> row{};
  std::array<Complex, kMostRows>& operator[](std::size_t r) { return row[r]; }
};
constexpr double kTwoPi = 2 * std::numbers::pi;

Result<void> refused(std::string finding, std::string remedy) {
  return failure(Problem::bad_number, "simulated windings", std::move(finding), std::move(remedy));
}

double coupling_of(const CoupledWindings& w, std::size_t i, std::size_t j) {
  if (i == j) return 1;
  const std::size_t n = w.windings.size(), a = std::min(i, j), b = std::max(i, j);
  std::size_t at = b - a - 1;
  for (std::size_t row = 0; row < a; ++row) at += n - 1 - row;
  return w.coupling[at];
}

/// Windings can store no negative energy: every leading determinant is positive.
bool possible(const CoupledWindings& w) {
  const double k12 = coupling_of(w, 0, 1);
  if (!(1 - k12 * k12 > 0)) return false;
  if (w.windings.size() == 2) return true;
  const double k13 = coupling_of(w, 0, 2), k23 = coupling_of(w, 1, 2);
  return 1 - k12 * k12 - k13 * k13 - k23 * k23 + 2 * k12 * k13 * k23 > 0;
}

Result<void> check(const CoupledWindings& w) {
  const std::size_t n = w.windings.size();
  if (n < 2 || n > 3) return refused(fmt::format("{} windings", n), "give two or three");
  if (w.coupling.size() != n * (n - 1) / 2) return refused("a coupling is missing", "give one for each pair of windings");
  for (const Winding& each : w.windings) {
    const bool fine = std::isfinite(each.inductance_h) && each.inductance_h > 0 && std::isfinite(each.resistance_ohm) &&
                      each.resistance_ohm >= 0 && std::isfinite(each.skin_ohm) && each.skin_ohm >= 0 &&
                      std::isfinite(each.capacitance_f) && each.capacitance_f >= 0;
    if (!fine) return refused("a winding has an inductance, resistance or capacitance that cannot be", "give positive values");
  }
  for (const double k : w.coupling) {
    if (!std::isfinite(k)) return refused("a coupling is no number", "give -1 to 1");
  }
  if (!possible(w)) return refused("no windings have these couplings: some currents would store negative energy", "give smaller couplings");
  if (!(w.link_h >= 0 && w.link_ohm >= 0 && std::isfinite(w.link_h + w.link_ohm))) return refused("a link that cannot be", "give zero or more");
  if (!(w.noise_ratio >= 0 && w.noise_ratio < 1)) return refused("a noise that cannot be", "give a ratio such as 0.1 %");
  if (!(w.first_hz > 0 && w.last_hz >= w.first_hz && std::isfinite(w.last_hz))) return refused("a sweep that ends before it begins", "give rising frequencies");
  if (w.points < 1 || w.points > 1'000'000) return refused(fmt::format("a sweep of {} points", w.points), "give 1 to 1000000");
  return {};
}

/// Solves a x = b by elimination with pivots; the matrices have a few rows.
Column solved(Matrix a, Column b, std::size_t n) {
  for (std::size_t c = 0; c < n; ++c) {
    std::size_t pivot = c;
    for (std::size_t r = c + 1; r < n; ++r) pivot = std::abs(a[r][c]) > std::abs(a[pivot][c]) ? r : pivot;
    std::swap(a[c], a[pivot]);
    std::swap(b[c], b[pivot]);
    for (std::size_t r = c + 1; r < n; ++r) {
      const Complex factor = a[r][c] / a[c][c];
      for (std::size_t k = c; k < n; ++k) a[r][k] -= factor * a[c][k];
      b[r] -= factor * b[c];
    }
  }
  Column x{};
  for (std::size_t r = n; r-- > 0;) {
    Complex sum = b[r];
    for (std::size_t k = r + 1; k < n; ++k) sum -= a[r][k] * x[k];
    x[r] = sum / a[r][r];
  }
  return x;
}

/// Equations of the windings: unknown currents i of the coils, then voltages v across them.
///   v_a = sum_b z_ab i_b;   current into terminal a: i_a + j w C_a v_a = what the connection gives it
struct Equations {
  Matrix a;
  Column b{};
  std::size_t n = 0;
};

Equations equations(const CoupledWindings& w, double omega) {
  const std::size_t n = w.windings.size();
  Equations e{{}, {}, n};
  for (std::size_t i = 0; i < n; ++i) {
    const Winding& each = w.windings[i];
    for (std::size_t j = 0; j < n; ++j) {
      const double mutual = coupling_of(w, i, j) * std::sqrt(each.inductance_h * w.windings[j].inductance_h);
      e.a[i][j] = Complex(0, omega * mutual);
    }
    e.a[i][i] += each.resistance_ohm + Complex(1, 1) * (each.skin_ohm * std::sqrt(omega / (kTwoPi * 1e6)));
    e.a[i][n + i] = -1;
    e.a[n + i][i] = 1;
    e.a[n + i][n + i] = Complex(0, omega * each.capacitance_f);
  }
  return e;
}

/// Voltages across all windings when these currents flow into their terminals.
Column voltages(const CoupledWindings& w, double omega, const Column& into) {
  Equations e = equations(w, omega);
  for (std::size_t i = 0; i < e.n; ++i) e.b[e.n + i] = into[i];
  const Column x = solved(e.a, e.b, 2 * e.n);
  Column v{};
  for (std::size_t i = 0; i < e.n; ++i) v[i] = x[e.n + i];
  return v;
}

/// Winding `driven` fed with one ampere, winding `shorted` closed by the link.
Complex shorted_impedance(const CoupledWindings& w, double omega, std::size_t driven, std::size_t shorted) {
  Equations e = equations(w, omega);
  e.b[e.n + driven] = 1;
  // The link takes its current out of the terminal: z_link (i + j w C v) + v = 0.
  const Complex link(w.link_ohm, omega * w.link_h);
  for (std::size_t c = 0; c < 2 * e.n; ++c) e.a[e.n + shorted][c] *= link;
  e.a[e.n + shorted][e.n + shorted] += 1;
  return solved(e.a, e.b, 2 * e.n)[e.n + driven];
}

CoupledWindings as_connected(const CoupledWindings& w) {
  CoupledWindings c = w;
  if (w.swapped_ports) {
    std::swap(c.windings[0], c.windings[1]);
    if (c.coupling.size() == 3) std::swap(c.coupling[1], c.coupling[2]);
  }
  return c;
}

std::vector<double> grid(const CoupledWindings& w) {
  std::vector<double> f;
  for (std::size_t i = 0; i < w.points; ++i) {
    const double part = w.points > 1 ? static_cast<double>(i) / static_cast<double>(w.points - 1) : 0;
    f.push_back(w.first_hz * std::pow(w.last_hz / w.first_hz, part));
  }
  return f;
}

Sweep empty_sweep(const CoupledWindings& w, std::size_t ports) {
  Sweep sweep;
  sweep.source.name = "simulated";
  sweep.dialect.format = "touchstone";
  sweep.frequency_hz = grid(w);
  sweep.ports = ports;
  sweep.as_read = "Z";
  sweep.reference_ohm.assign(ports, 50.0);
  sweep.bad.assign(sweep.frequency_hz.size(), false);
  return sweep;
}

Complex noisy(Complex z, double ratio, Random& random) {
  if (ratio == 0) return z;
  const double part = ratio / std::sqrt(2.0);
  const double re = random.normal(), im = random.normal();
  return z * Complex(1 + part * re, part * im);
}

}  // namespace

std::string_view name(Connection connection) {
  constexpr std::array kNames = {"primary-open", "primary-short", "secondary-open", "secondary-short", "aiding", "opposing"};
  return kNames[static_cast<std::size_t>(connection)];
}

Complex exact_impedance(const CoupledWindings& w, Connection connection, double frequency_hz) {
  const double omega = kTwoPi * frequency_hz;
  Column into{};
  switch (connection) {
    case Connection::primary_open: into[0] = 1; return voltages(w, omega, into)[0];
    case Connection::secondary_open: into[1] = 1; return voltages(w, omega, into)[1];
    case Connection::primary_short: return shorted_impedance(w, omega, 0, 1);
    case Connection::secondary_short: return shorted_impedance(w, omega, 1, 0);
    case Connection::aiding:
    case Connection::opposing: {
      // What is called aiding is what adds, whichever ends that joins.
      const double turn = (connection == Connection::aiding ? 1 : -1) * (coupling_of(w, 0, 1) < 0 ? -1 : 1);
      into[0] = 1;
      into[1] = turn;
      const Column v = voltages(w, omega, into);
      return v[0] + turn * v[1];
    }
  }
  return {};
}

Complex exact_ratio(const CoupledWindings& w, std::size_t from, std::size_t to, double frequency_hz) {
  Column into{};
  into[from] = 1;
  const Column v = voltages(w, kTwoPi * frequency_hz, into);
  return v[to] / v[from];
}

Result<CoupledTruth> coupled_truth(const CoupledWindings& windings) {
  if (const auto good = check(windings); !good) return failure(good);
  const CoupledWindings w = as_connected(windings);
  const double l1 = w.windings[0].inductance_h, l2 = w.windings[1].inductance_h, k = coupling_of(w, 0, 1);
  return CoupledTruth{l1, l2, k * std::sqrt(l1 * l2), k, std::sqrt(l1 / l2), l1 * (1 - k * k), l2 * (1 - k * k)};
}

Result<Sweep> simulate_connection(const CoupledWindings& windings, Connection connection) {
  if (const auto good = check(windings); !good) return failure(good);
  const CoupledWindings w = as_connected(windings);
  Sweep sweep = empty_sweep(w, 1);
  Random random(w.seed, 1 + static_cast<std::uint64_t>(connection));
  for (const double f : sweep.frequency_hz) sweep.z_ohm.push_back({noisy(exact_impedance(w, connection, f), w.noise_ratio, random)});
  return sweep;
}

Result<Sweep> simulate_ports(const CoupledWindings& windings) {
  if (const auto good = check(windings); !good) return failure(good);
  const CoupledWindings w = as_connected(windings);
  const std::size_t n = w.windings.size();
  Sweep sweep = empty_sweep(w, n);
  Random random(w.seed, 20);
  for (const double f : sweep.frequency_hz) {
    std::vector<Complex> z(n * n);
    for (std::size_t driven = 0; driven < n; ++driven) {
      Column into{};
      into[driven] = 1;
      const Column v = voltages(w, kTwoPi * f, into);
      for (std::size_t seen = 0; seen < n; ++seen) z[seen * n + driven] = v[seen];
    }
    z[1] *= 1 + w.not_reciprocal;
    for (Complex& each : z) each = noisy(each, w.noise_ratio, random);
    sweep.z_ohm.push_back(std::move(z));
  }
  return sweep;
}

}  // namespace coilassay::synthetic

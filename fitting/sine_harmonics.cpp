#include "fitting/sine_harmonics.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "fitting/blocks.h"
#include "fitting/sine_blocks.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;

constexpr std::size_t kMost = 1U << 14;
constexpr std::size_t kStretches = 16;
constexpr double kManyCycles = 60;
constexpr int kHighest = 5;
constexpr int kColumns = 2 * kHighest + 1;
using Matrix = Eigen::Matrix<double, kColumns, kColumns>;
using Vector = Eigen::Matrix<double, kColumns, 1>;

struct Stretch {
  std::size_t first, end;
};

std::vector<Stretch> stretches_of(std::size_t samples, double cycles) {
  if (samples <= kMost || cycles < kManyCycles) return {{0, samples}};
  std::vector<Stretch> stretches;
  const std::size_t length = kMost / kStretches;
  for (std::size_t s = 0; s < kStretches; ++s) {
    const std::size_t first = s * (samples - length) / (kStretches - 1);
    stretches.push_back({first, first + length});
  }
  return stretches;
}

/// Normal equations of cos(h phi), -sin(h phi), h = 1 ... orders, and 1; phi = omega (n - centre).
struct Equations {
  int orders = 1;
  double omega = 0, centre = 0, reference = 0;
  Matrix normal = Matrix::Zero();
  Vector right = Vector::Zero();
  double squares = 0;
  std::size_t present = 0;

  int columns() const { return 2 * orders + 1; }

  /// Nothing missing: products of the columns in closed form, those with the samples by the fast kernel.
  bool add_whole(std::span<const double> y, const Stretch& stretch) {
    const std::size_t length = stretch.end - stretch.first;
    const std::span<const double> part = y.subspan(stretch.first, length);
    const double start = static_cast<double>(stretch.first) - centre;
    Vector with = Vector::Zero();
    double square = 0;
    for (int h = 1; h <= orders; ++h) {
      const BlockSums sums = block_sums(part, length, 1, std::remainder(h * omega, 2 * std::numbers::pi), reference);
      if (!std::isfinite(sums.sum[0])) return false;
      const Complex turned = sums.demodulated[0] * std::polar(1.0, -h * omega * start);
      with[2 * h - 2] = turned.real();
      with[2 * h - 1] = turned.imag();
      with[columns() - 1] = sums.sum[0];
      square = sums.square[0];
    }
    right += with;
    squares += square;
    present += length;
    // E(k): sum of e^{j k phi}.
    std::array<Complex, 2 * kHighest + 1> e;
    for (int k = 0; k <= 2 * orders; ++k) {
      e[static_cast<std::size_t>(k)] = std::polar(1.0, k * omega * start) * turning_sum(k * omega, length).value;
    }
    const auto sum_of = [&e](int k) { return k < 0 ? std::conj(e[static_cast<std::size_t>(-k)]) : e[static_cast<std::size_t>(k)]; };
    const int last = columns() - 1;
    for (int a = 1; a <= orders; ++a) {
      for (int b = 1; b <= a; ++b) {
        const Complex minus = sum_of(a - b), plus = sum_of(a + b);
        normal(2 * a - 2, 2 * b - 2) += (minus.real() + plus.real()) / 2;
        normal(2 * a - 1, 2 * b - 1) += (minus.real() - plus.real()) / 2;
        normal(2 * a - 1, 2 * b - 2) -= (plus.imag() + minus.imag()) / 2;
        if (b < a) normal(2 * a - 2, 2 * b - 1) -= (plus.imag() - minus.imag()) / 2;
      }
      normal(last, 2 * a - 2) += sum_of(a).real();
      normal(last, 2 * a - 1) -= sum_of(a).imag();
    }
    normal(last, last) += static_cast<double>(length);
    return true;
  }

  void add_sample_by_sample(std::span<const double> y, const Stretch& stretch) {
    const Complex turn = std::polar(1.0, omega);
    Complex phase;
    Vector row = Vector::Zero();
    for (std::size_t n = stretch.first; n < stretch.end; ++n) {
      phase = (n - stretch.first) % 64 == 0 ? std::polar(1.0, omega * (static_cast<double>(n) - centre)) : phase * turn;
      if (!std::isfinite(y[n])) continue;
      const double v = y[n] - reference;
      Complex power = 1;
      for (int h = 0; h < orders; ++h) {
        power *= phase;
        row[2 * h] = power.real();
        row[2 * h + 1] = -power.imag();
      }
      row[columns() - 1] = 1;
      for (int a = 0; a < columns(); ++a) {
        right[a] += row[a] * v;
        for (int b = 0; b <= a; ++b) normal(a, b) += row[a] * row[b];
      }
      squares += v * v;
      ++present;
    }
  }
};

/// Orders to fit: below half the sampling rate, and one only when there are enough cycles to tell them apart.
int highest_order(double omega, double cycles) {
  if (cycles < 1.5) return 1;
  int highest = 1;
  while (highest < kHighest && (highest + 1) * omega < 0.98 * std::numbers::pi) ++highest;
  return highest;
}

}  // namespace

SampleLook look_at_samples(std::span<const double> y, double omega, double centre, double reference) {
  const double cycles = omega * static_cast<double>(y.size()) / (2 * std::numbers::pi);
  Equations equations;
  equations.orders = highest_order(omega, cycles);
  equations.omega = omega;
  equations.centre = centre;
  equations.reference = reference;
  for (const Stretch& stretch : stretches_of(y.size(), cycles)) {
    if (!equations.add_whole(y, stretch)) equations.add_sample_by_sample(y, stretch);
  }
  const int columns = equations.columns();
  SampleLook look;
  look.present = equations.present;
  look.harmonics.assign(kHighest - 1, 0.0);
  const Eigen::MatrixXd used = equations.normal.topLeftCorner(columns, columns).selfadjointView<Eigen::Lower>();
  const Eigen::VectorXd right = equations.right.head(columns);
  const Eigen::LDLT<Eigen::MatrixXd> ldlt(used);
  const double present = static_cast<double>(look.present);
  look.dof = std::max(1.0, present - columns - 1);
  if (!ldlt.isPositive() || !(ldlt.vectorD().minCoeff() > 1e-9 * present)) {
    look.sigma = std::sqrt(equations.squares / look.dof);
    return look;
  }
  const Eigen::VectorXd x = ldlt.solve(right);
  look.sigma = std::sqrt(std::max(0.0, equations.squares - x.dot(right)) / look.dof);
  for (int h = 2; h <= equations.orders; ++h) look.harmonics[static_cast<std::size_t>(h - 2)] = {x[2 * h - 2], x[2 * h - 1]};
  look.harmonic_u =
      equations.orders > 1 ? look.sigma * std::sqrt(ldlt.solve(Eigen::MatrixXd::Identity(columns, columns))(2, 2)) : 0;
  return look;
}

}  // namespace coilassay

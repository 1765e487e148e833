#include "fitting/sine_harmonics.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <numbers>

namespace coilassay {
namespace {

using Complex = std::complex<double>;

constexpr std::size_t kMost = 1U << 16;
constexpr std::size_t kStretches = 16;
constexpr int kHighest = 5;
constexpr int kColumns = 2 * kHighest + 1;

struct Stretch {
  std::size_t first, end;
};

std::vector<Stretch> stretches_of(std::size_t samples) {
  if (samples <= kMost) return {{0, samples}};
  std::vector<Stretch> stretches;
  const std::size_t length = kMost / kStretches;
  for (std::size_t s = 0; s < kStretches; ++s) {
    const std::size_t first = s * (samples - length) / (kStretches - 1);
    stretches.push_back({first, first + length});
  }
  return stretches;
}

/// Orders to fit: below half the sampling rate, and one only when there are enough cycles to tell them apart.
int highest_order(double omega, double cycles) {
  if (cycles < 1.5) return 1;
  int highest = 1;
  while (highest < kHighest && (highest + 1) * omega < 0.98 * std::numbers::pi) ++highest;
  return highest;
}

}  // namespace

SampleLook look_at_samples(std::span<const double> y, double omega, double centre, Complex phasor, double offset) {
  SampleLook look;
  const double cycles = omega * static_cast<double>(y.size()) / (2 * std::numbers::pi);
  const int orders = highest_order(omega, cycles);
  const int columns = 2 * orders + 1;
  using Matrix = Eigen::Matrix<double, kColumns, kColumns>;
  using Vector = Eigen::Matrix<double, kColumns, 1>;
  Matrix normal = Matrix::Zero();
  Vector right = Vector::Zero(), row = Vector::Zero();
  double squares = 0;
  // What the known sine leaves over is fitted: the sums stay as small as the noise and the harmonics.
  const Complex turn = std::polar(1.0, omega);
  for (const Stretch& stretch : stretches_of(y.size())) {
    Complex phase;
    for (std::size_t n = stretch.first; n < stretch.end; ++n) {
      phase = (n - stretch.first) % 64 == 0 ? std::polar(1.0, omega * (static_cast<double>(n) - centre)) : phase * turn;
      if (!std::isfinite(y[n])) continue;
      const double left = y[n] - offset - (phasor * phase).real();
      Complex power = 1;
      for (int h = 0; h < orders; ++h) {
        power *= phase;
        row[2 * h] = power.real();
        row[2 * h + 1] = -power.imag();
      }
      row[columns - 1] = 1;
      for (int a = 0; a < columns; ++a) {
        right[a] += row[a] * left;
        for (int b = 0; b <= a; ++b) normal(a, b) += row[a] * row[b];
      }
      squares += left * left;
      ++look.present;
    }
  }
  look.harmonics.assign(kHighest - 1, 0.0);
  look.fundamental = phasor;
  const Eigen::MatrixXd used = normal.topLeftCorner(columns, columns).selfadjointView<Eigen::Lower>();
  const Eigen::LDLT<Eigen::MatrixXd> ldlt(used);
  const double present = static_cast<double>(look.present);
  look.dof = std::max(1.0, present - columns - 1);
  if (!ldlt.isPositive() || !(ldlt.vectorD().minCoeff() > 1e-9 * present)) {
    look.sigma = std::sqrt(squares / look.dof);
    return look;
  }
  const Eigen::VectorXd x = ldlt.solve(right.head(columns));
  look.sigma = std::sqrt(std::max(0.0, squares - x.dot(right.head(columns))) / look.dof);
  look.fundamental += Complex(x[0], x[1]);
  for (int h = 1; h < orders; ++h) look.harmonics[static_cast<std::size_t>(h - 1)] = {x[2 * h], x[2 * h + 1]};
  look.harmonic_u = orders > 1 ? look.sigma * std::sqrt(ldlt.solve(Eigen::MatrixXd::Identity(columns, columns))(2, 2)) : 0;
  return look;
}

}  // namespace coilassay

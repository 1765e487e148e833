#include "acquire/touchstone_matrix.h"

#include <cassert>
#include <cmath>
#include <utility>

namespace coilassay {
namespace {

using Complex = std::complex<double>;
using Matrix = std::vector<Complex>;

Matrix product(const Matrix& a, const Matrix& b, std::size_t n) {
  Matrix c(n * n);
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t k = 0; k < n; ++k) {
      for (std::size_t j = 0; j < n; ++j) c[i * n + j] += a[i * n + k] * b[k * n + j];
    }
  }
  return c;
}

bool finite(const Matrix& m) {
  for (const Complex& v : m) {
    if (!std::isfinite(v.real()) || !std::isfinite(v.imag())) return false;
  }
  return true;
}

std::optional<Matrix> from_scattering(const Matrix& s, const std::vector<double>& reference_ohm) {
  const std::size_t n = reference_ohm.size();
  Matrix minus(n * n);
  Matrix plus(n * n);
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t j = 0; j < n; ++j) {
      const double one = i == j ? 1 : 0;
      minus[i * n + j] = one - s[i * n + j];
      plus[i * n + j] = one + s[i * n + j];
    }
  }
  const auto inverted = inverse(std::move(minus), n);
  if (!inverted) return std::nullopt;
  Matrix z = product(*inverted, plus, n);
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t j = 0; j < n; ++j) z[i * n + j] *= std::sqrt(reference_ohm[i] * reference_ohm[j]);
  }
  return z;
}

std::optional<Matrix> from_hybrid(PortParameter kind, const Matrix& m) {
  const Complex determinant = m[0] * m[3] - m[1] * m[2];
  const Complex by = kind == PortParameter::h ? m[3] : m[0];
  if (by == 0.0) return std::nullopt;
  if (kind == PortParameter::h) return Matrix{determinant / by, m[1] / by, -m[2] / by, 1.0 / by};
  return Matrix{1.0 / by, -m[1] / by, m[2] / by, determinant / by};
}

/// Undoes the normalisation to r.
void denormalise(PortParameter kind, Matrix& m, double r) {
  switch (kind) {
    case PortParameter::s: break;
    case PortParameter::z:
      for (Complex& v : m) v *= r;
      break;
    case PortParameter::y:
      for (Complex& v : m) v /= r;
      break;
    case PortParameter::h:
      m[0] *= r;
      m[3] /= r;
      break;
    case PortParameter::g:
      m[0] /= r;
      m[3] *= r;
      break;
  }
}

}  // namespace

std::optional<Matrix> inverse(Matrix a, std::size_t n) {
  assert(a.size() == n * n);
  Matrix inverted(n * n);
  for (std::size_t i = 0; i < n; ++i) inverted[i * n + i] = 1;
  double largest = 0;
  for (const Complex& v : a) largest = std::fmax(largest, std::abs(v));
  for (std::size_t column = 0; column < n; ++column) {
    std::size_t pivot = column;
    for (std::size_t row = column + 1; row < n; ++row) {
      if (std::abs(a[row * n + column]) > std::abs(a[pivot * n + column])) pivot = row;
    }
    // What is left is the rounding of the elimination.
    if (!(std::abs(a[pivot * n + column]) > 1e-14 * largest)) return std::nullopt;
    for (std::size_t j = 0; j < n && pivot != column; ++j) {
      std::swap(a[pivot * n + j], a[column * n + j]);
      std::swap(inverted[pivot * n + j], inverted[column * n + j]);
    }
    const Complex scale = 1.0 / a[column * n + column];
    for (std::size_t j = 0; j < n; ++j) {
      a[column * n + j] *= scale;
      inverted[column * n + j] *= scale;
    }
    for (std::size_t row = 0; row < n; ++row) {
      const Complex factor = a[row * n + column];
      if (row == column || factor == 0.0) continue;
      for (std::size_t j = 0; j < n; ++j) {
        a[row * n + j] -= factor * a[column * n + j];
        inverted[row * n + j] -= factor * inverted[column * n + j];
      }
    }
  }
  return inverted;
}

std::optional<Matrix> to_impedance(PortParameter kind, Matrix values, const std::vector<double>& reference_ohm,
                                   bool normalised) {
  const std::size_t n = reference_ohm.size();
  assert(values.size() == n * n);
  assert(n == 2 || (kind != PortParameter::h && kind != PortParameter::g));
  if (!finite(values)) return std::nullopt;
  if (normalised) denormalise(kind, values, reference_ohm.front());
  std::optional<Matrix> z;
  switch (kind) {
    case PortParameter::s: z = from_scattering(values, reference_ohm); break;
    case PortParameter::z: z = std::move(values); break;
    case PortParameter::y: z = inverse(std::move(values), n); break;
    case PortParameter::h:
    case PortParameter::g: z = from_hybrid(kind, values); break;
  }
  if (z && !finite(*z)) return std::nullopt;
  return z;
}

}  // namespace coilassay

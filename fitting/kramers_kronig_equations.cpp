#include "fitting/kramers_kronig_equations.h"

#include <Eigen/QR>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace coilassay {

namespace {

using Complex = std::complex<double>;
using Matrix = Eigen::MatrixXd;
using Vector = Eigen::VectorXd;
constexpr double kCircuitWidth = 0.1;      // of the law of a change of the logarithm of a parameter ...
constexpr double kRelaxationWidth = 10;    // ... and of a coefficient in ln z

Eigen::Index rows_of(std::size_t points) { return 2 * static_cast<Eigen::Index>(points); }

}  // namespace

CausalEquations::CausalEquations(const CircuitData& data, const std::vector<std::size_t>& points, const Circuit& about)
    : equations_(data, points, false), about_(about), y_(rows_of(points.size())), share_(points.size(), 1.0) {
  if (data.errors == SweepErrors::reflection) reference_ = data.reference_ohm;
  for (std::size_t i = 0; i < points.size(); ++i) omega_.push_back(2 * std::numbers::pi * equations_.frequency_hz(i));
  look();
}

void CausalEquations::move(const Vector& coefficients) {
  const auto order = parameters_of(about_.family);
  for (std::size_t k = 0; k < order.size(); ++k) {
    double& value = about_[order[k]];
    value *= std::exp(std::clamp(coefficients[kBroad + static_cast<Eigen::Index>(k)], -1.0, 1.0));
    if (order[k] == CircuitParameter::relaxation_share) value = std::fmin(value, 1.0);
  }
  look();
}

void CausalEquations::move_to(const Circuit& about) {
  about_ = about;
  look();
}

void CausalEquations::add_resonance(const CausalResonance& resonance) {
  resonances_.push_back(resonance);
  fixed_.conservativeResize(Eigen::NoChange, fixed_.cols() + 2);
  put_resonance(resonances_.size() - 1);
}

void CausalEquations::drop_resonance() {
  resonances_.pop_back();
  fixed_.conservativeResize(Eigen::NoChange, fixed_.cols() - 2);
}

double CausalEquations::spacing(std::size_t i) const {
  const std::size_t a = i == 0 ? 0 : i - 1, b = std::min(i + 1, size() - 1);
  return std::log(omega_[b] / omega_[a]) / static_cast<double>(b - a);
}

Eigen::Index CausalEquations::circuit_columns() const { return static_cast<Eigen::Index>(parameters_of(about_.family).size()); }

Matrix CausalEquations::columns(std::size_t elements) const {
  Matrix a(fixed_.rows(), fixed_.cols() + static_cast<Eigen::Index>(elements));
  a.leftCols(fixed_.cols()) = fixed_;
  const double first = 1 / (3 * omega_.back()), last = 3 / omega_.front();
  for (std::size_t k = 0; k < elements; ++k) {
    const double tau = first * std::pow(last / first, (static_cast<double>(k) + 0.5) / static_cast<double>(elements));
    for (std::size_t i = 0; i < size(); ++i) put(a, i, fixed_.cols() + static_cast<Eigen::Index>(k), 1.0 / Complex(1, omega_[i] * tau));
  }
  return a;
}

void CausalEquations::look() {
  const auto order = parameters_of(about_.family);
  std::array<Complex, kCircuitParameters> slope;
  fixed_.resize(rows_of(size()), kBroad + static_cast<Eigen::Index>(order.size() + 2 * resonances_.size()));
  for (std::size_t i = 0; i < size(); ++i) {
    const Complex r = -equations_.residual(about_, i);
    y_[row(i)] = r.real();
    y_[row(i) + 1] = r.imag();
    const Complex z = impedance_and_log_slopes(about_, equations_.frequency_hz(i), slope);
    if (reference_ > 0) share_[i] = 2 * reference_ * z / ((z + reference_) * (z + reference_));
    put(fixed_, i, 0, 1.0);
    put(fixed_, i, 1, Complex(0, omega_[i] / omega_.back()));
    put(fixed_, i, 2, Complex(0, -omega_.front() / omega_[i]));
    for (std::size_t k = 0; k < order.size(); ++k) put(fixed_, i, kBroad + static_cast<Eigen::Index>(k), about_[order[k]] * slope[k]);
  }
  for (std::size_t k = 0; k < resonances_.size(); ++k) put_resonance(k);
}

void CausalEquations::put_resonance(std::size_t k) {
  const Eigen::Index column = kBroad + circuit_columns() + 2 * static_cast<Eigen::Index>(k);
  for (std::size_t i = 0; i < size(); ++i) {
    const double x = omega_[i] / resonances_[k].omega;
    const Complex tank = resonances_[k].damping / Complex(1 - x * x, resonances_[k].damping * x);
    put(fixed_, i, column, tank);
    put(fixed_, i, column + 1, Complex(0, x) * tank);
  }
}

void CausalEquations::put(Matrix& a, std::size_t i, Eigen::Index column, Complex value) const {
  const Complex w = equations_.whitened(i, value * share_[i]);
  a(row(i), column) = w.real();
  a(row(i) + 1, column) = w.imag();
}

CausalSolution solve_causal(const CausalEquations& equations, const std::vector<bool>& used, std::size_t elements) {
  CausalSolution s;
  s.elements = elements;
  const Matrix all = equations.columns(elements);
  const Eigen::Index count = all.cols();
  // Columns that are nearly alike (close relaxations; a change of scale of the circuit and the constant) are told apart by wide
  // laws around 0, as further rows; where the data speak these weigh nothing.
  Matrix a = Matrix::Zero(all.rows() + count, count);
  a.topRows(all.rows()) = all;
  Vector y = Vector::Zero(a.rows());
  y.head(all.rows()) = equations.y();
  for (Eigen::Index k = 0; k < count; ++k) {
    const bool of_circuit = k >= CausalEquations::kBroad && k < CausalEquations::kBroad + equations.circuit_columns();
    a(all.rows() + k, k) = 1 / (of_circuit ? kCircuitWidth : kRelaxationWidth);
  }
  double rows = 0;
  for (std::size_t i = 0; i < equations.size(); ++i) {
    const Eigen::Index r = CausalEquations::row(i);
    if (used[i]) rows += 2;
    else a.middleRows<2>(r).setZero(), y.segment<2>(r).setZero();
  }
  const Eigen::HouseholderQR<Matrix> qr(a);
  s.coefficients = qr.solve(y);
  s.residual = equations.y() - all * s.coefficients;
  const Matrix q = qr.householderQ() * Matrix::Identity(a.rows(), count);
  double leverage = 0;
  for (std::size_t i = 0; i < equations.size(); ++i) {
    const auto rows_of_point = q.middleRows<2>(CausalEquations::row(i));
    s.rest.push_back(Eigen::Matrix2d::Identity() - rows_of_point * rows_of_point.transpose());
    leverage += 2 - s.rest.back().trace();
  }
  double positive = 0, negative = 0;
  for (std::size_t k = 0; k < elements; ++k) {
    const Eigen::Index column = equations.fixed_columns() + static_cast<Eigen::Index>(k);
    const double c = s.coefficients[column];
    (c < 0 ? negative : positive) += std::fabs(c);
  }
  if (elements > 0) s.mu = positive > 0 ? std::fmax(1 - negative / positive, -1) : -1;
  for (std::size_t i = 0; i < equations.size(); ++i) {
    if (used[i]) s.chi += s.residual.segment<2>(CausalEquations::row(i)).squaredNorm();
  }
  s.dof = rows - leverage;
  return s;
}

}  // namespace coilassay

// The linear equations behind test_kramers_kronig: a causal model of ln z (or of S) around a circuit.
#pragma once

#include <Eigen/Core>
#include <cmath>
#include <complex>
#include <cstddef>
#include <vector>

#include "fitting/circuit_equations.h"

namespace coilassay {

/// A resonance the circuit lacks: 1/(1 - x^2 + j D x) and j x times that, x = omega/omega_0.
struct CausalResonance {
  double omega = 1, damping = 1;
};

/// rho of every point, whitened, and the columns whose real combinations are causal. Two rows a point: real, imaginary.
class CausalEquations {
 public:
  CausalEquations(const CircuitData& data, const std::vector<std::size_t>& points, const Circuit& about);

  /// The circuit with its parameters moved by what a solution says; columns are slopes and hold near the circuit only.
  void move(const Eigen::VectorXd& coefficients);
  void move_to(const Circuit& about);
  const Circuit& about() const { return about_; }

  /// What the logarithm of a pole and a zero close to it adds, to first order.
  void add_resonance(const CausalResonance& resonance);
  void drop_resonance();

  std::size_t size() const { return omega_.size(); }
  static Eigen::Index row(std::size_t i) { return 2 * static_cast<Eigen::Index>(i); }
  double omega(std::size_t i) const { return omega_[i]; }
  double frequency_hz(std::size_t i) const { return equations_.frequency_hz(i); }
  /// Half the logarithm of the ratio of the neighbours' frequencies.
  double spacing(std::size_t i) const;
  const Eigen::VectorXd& y() const { return y_; }
  double rounding() const { return std::sqrt(equations_.rounding() / static_cast<double>(size())); }   // of a residual
  std::complex<double> unwhitened(std::size_t i, std::complex<double> r) const { return equations_.unwhitened(i, r); }

  /// Columns: a constant and two for what lies outside the sweep, the logarithms of the circuit's parameters, the resonances;
  /// then `elements` relaxations, evenly spread over the logarithm of their time constants.
  Eigen::MatrixXd columns(std::size_t elements) const;
  static constexpr Eigen::Index kBroad = 3;
  Eigen::Index circuit_columns() const;
  Eigen::Index fixed_columns() const { return fixed_.cols(); }   // all but the relaxations

 private:
  void look();   // rho and the columns that are always there, at the circuit as it is
  void put_resonance(std::size_t k);
  void put(Eigen::MatrixXd& a, std::size_t i, Eigen::Index column, std::complex<double> value) const;

  CircuitEquations equations_;
  Circuit about_;
  Eigen::MatrixXd fixed_;
  Eigen::VectorXd y_;
  std::vector<double> omega_;
  double reference_ = 0;                       // of S; 0: errors are alike in ln z
  std::vector<std::complex<double>> share_;    // dS/d ln z, or 1
  std::vector<CausalResonance> resonances_;
};

struct CausalSolution {
  Eigen::VectorXd coefficients;
  Eigen::VectorXd residual;            // all rows; of points left out: what the others predict
  std::vector<Eigen::Matrix2d> rest;   // covariance of the residual of each point: 1 less its leverage
  double chi = 0, dof = 0;             // of the points used
  double mu = 1;                       // 1 - (sum of negative)/(sum of positive relaxations)
  std::size_t elements = 0;
};

/// Least squares over the points used.
CausalSolution solve_causal(const CausalEquations& equations, const std::vector<bool>& used, std::size_t elements);

}  // namespace coilassay

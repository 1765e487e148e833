// The weighted equations of a circuit's fit and their descent: the inner loops behind circuit_fit.
#pragma once

#include <Eigen/Core>
#include <array>
#include <complex>
#include <cstddef>
#include <span>
#include <vector>

#include "fitting/circuit.h"
#include "fitting/circuit_fit.h"

namespace coilassay {

/// Every parameter a family may have fits in here; those it lacks stay 0.
using CircuitVector = Eigen::Matrix<double, kCircuitParameters, 1>;
using CircuitMatrix = Eigen::Matrix<double, kCircuitParameters, kCircuitParameters>;

/// Chi-square at a circuit with its slopes to natural parameters multiplied by `unit` of each.
struct CircuitNormal {
  double chi = 0;
  CircuitVector gradient;   // J^T r
  CircuitMatrix normal;     // J^T J
};

/// Residuals of a subset of the points of a sweep.
class CircuitEquations {
 public:
  /// `points` are indices of usable points; `ratio`: in ln z whatever data.errors says, its errors carried over to ln z.
  CircuitEquations(const CircuitData& data, std::span<const std::size_t> points, bool ratio);

  std::size_t size() const { return rows_.size(); }
  std::size_t numbers() const;   // real residuals: two a row where both parts are measured
  double frequency_hz(std::size_t row) const { return rows_[row].f; }
  double rounding() const;       // chi-square that the last digits of the arithmetic make
  /// Further weight of each row (Huber); 1 without.
  void weigh(std::span<const double> weights);

  /// `unit`: what a slope is multiplied by; the value itself for logarithms, 1 for natural parameters.
  void look(const Circuit& circuit, std::span<const double> unit, CircuitNormal& result) const;
  double chi_square(const Circuit& circuit) const;
  /// Whitened residual of one row, without Huber's weight.
  std::complex<double> residual(const Circuit& circuit, std::size_t row) const;
  /// An error of ln z (or S) of one row in units of its standard deviations, and back (0 where nothing was measured).
  std::complex<double> whitened(std::size_t row, std::complex<double> error) const;
  std::complex<double> unwhitened(std::size_t row, std::complex<double> residual) const;

 private:
  struct Row {
    double f = 0;
    std::complex<double> target;         // 1/z or S
    double w11 = 0, w21 = 0, w22 = 0;    // lower triangle that whitens (real, imaginary)
    double weight = 1;
  };
  std::complex<double> raw_residual(const Row& row, std::complex<double> z) const;
  template <std::size_t N>
  void look_at(const Circuit& circuit, std::span<const double> unit, CircuitNormal& result) const;

  bool ratio_ = true;
  double reference_ = 50;
  std::vector<Row> rows_;
};

/// Bit i set: parameter i of the family's order keeps its value.
using HeldParameters = unsigned;

struct SettledCircuit {
  Circuit circuit;
  double chi = HUGE_VAL;
  CircuitNormal last;        // by logarithms
  int iterations = 0;
  FitStop stop = FitStop::failed;
};

/// Levenberg's and Marquardt's descent over logarithms from `start`, until a step would lower chi-square by less than
/// `settled` times chi-square per row. k_rel stops at 1.
/// `damping`: of the first step; small where the start is known to be near.
SettledCircuit descend(const CircuitEquations& equations, const Circuit& start, HeldParameters held, int most_iterations,
                       double settled, double damping = 1e-3);

/// The points of data that can be used, rising in frequency.
std::vector<std::size_t> usable_points(const CircuitData& data);

}  // namespace coilassay

#include "fitting/circuit_fit.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>

#include "fitting/circuit_equations.h"
#include "fitting/circuit_limits.h"
#include "fitting/circuit_start.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using P = CircuitParameter;
constexpr int kMostIterations = 200;
constexpr double kSettled = 1e-9;      // of a step, in squared standard uncertainties
constexpr double kFewSettled = 1e-3;
constexpr int kQuickIterations = 40;
constexpr double kQuickSettled = 1e-4;
constexpr std::size_t kManyPoints = 800;
constexpr double kNearDamping = 1e-8;  // after a descent on half of these
constexpr double kLeastPivot = 1e-12;   // of the normal matrix with a diagonal of ones: below, nothing is left of 16 digits
constexpr double kVisible = 4;         // information of a logarithm below which it is called not seen by the descent

/// A logarithm whose parameter has become too small to matter has no slope and never comes back: it is put where it would be
/// just visible, and the better result kept.
void rescue(const CircuitEquations& equations, bool phase, SettledCircuit& best, int most_iterations, double settled) {
  const auto order = parameters_of(best.circuit.family);
  for (std::size_t i = 0; i < order.size(); ++i) {
    const auto k = static_cast<Eigen::Index>(i);
    if (order[i] == P::relaxation_share || order[i] == P::second_frequency || order[i] == P::second_damping) continue;
    const double noise = std::fmax(best.chi / std::fmax(2.0 * static_cast<double>(equations.size()), 1), 1e-300);
    if (best.last.normal(k, k) / noise >= kVisible) continue;
    // Slope to the parameter itself, which does not vanish.
    std::array<double, kCircuitParameters> one{};
    one[i] = 1;
    CircuitNormal natural;
    Circuit without = best.circuit;
    without[order[i]] = 0;
    equations.look(without, std::span<const double>(one).first(order.size()), natural);
    std::vector<double> tries;
    if (natural.normal(k, k) > 0) {
      const double visible = std::sqrt(noise / natural.normal(k, k));
      tries = {3 * visible, 30 * visible};
    }
    if (!phase) {
      // The modulus of a lossless circuit has no slope to a loss: small parts of the reactance at resonance are tried.
      const double reactance = std::sqrt(best.circuit[P::inductance] / best.circuit[P::capacitance]);
      const bool conductance = order[i] == P::parallel_conductance;
      if (conductance || order[i] == P::series_resistance || order[i] == P::skin_resistance) {
        for (const double part : {1e-3, 3e-2}) tries.push_back(conductance ? part / reactance : part * reactance);
      }
    }
    for (const double value : tries) {
      Circuit start = best.circuit;
      start[order[i]] = value;
      const SettledCircuit next = descend(equations, start, 0, most_iterations, settled);
      if (next.chi < best.chi) best = next;
    }
  }
}

/// Of the rows and columns of these parameters; empty where it does not exist. The diagonal is made equal first: the parameters differ by
/// many orders of magnitude.
Eigen::MatrixXd inverse_of(const CircuitMatrix& normal, const std::vector<std::size_t>& parameters) {
  const auto count = static_cast<Eigen::Index>(parameters.size());
  Eigen::MatrixXd some(count, count);
  for (Eigen::Index i = 0; i < count; ++i) {
    for (Eigen::Index j = 0; j < count; ++j) {
      some(i, j) = normal(static_cast<Eigen::Index>(parameters[static_cast<std::size_t>(i)]),
                          static_cast<Eigen::Index>(parameters[static_cast<std::size_t>(j)]));
    }
  }
  const Eigen::VectorXd unit = some.diagonal().cwiseMax(std::numeric_limits<double>::min()).cwiseSqrt().cwiseInverse();
  some = unit.asDiagonal() * some * unit.asDiagonal();
  const Eigen::LDLT<Eigen::MatrixXd> solver(some);
  if (count == 0 || solver.info() != Eigen::Success || !(solver.vectorD().minCoeff() > kLeastPivot)) return {};
  return unit.asDiagonal() * solver.solve(Eigen::MatrixXd::Identity(count, count)) * unit.asDiagonal();
}

void fill_statistics(const CircuitData& data, const std::vector<std::size_t>& points, const CircuitEquations& equations,
                     const SettledCircuit& settled, CircuitFit& result) {
  const std::size_t n = result.order.size();
  const auto count = static_cast<Eigen::Index>(n);
  result.circuit = settled.circuit;
  result.chi_square = settled.chi;
  result.residual.assign(data.size(), {std::nan(""), std::nan("")});
  result.used.assign(data.size(), false);
  for (std::size_t row = 0; row < points.size(); ++row) {
    result.residual[points[row]] = equations.residual(settled.circuit, row);
    result.used[points[row]] = true;
  }
  result.scale = data.scale_known ? 1 : std::sqrt(result.chi_square / result.dof);
  for (auto& r : result.residual) r /= result.scale > 0 ? result.scale : 1;

  // From logarithms to the parameters themselves; where one is so small that this loses digits, by another look.
  CircuitNormal natural = settled.last;
  bool lost = false;
  for (std::size_t i = 0; i < n; ++i) {
    const double value = settled.circuit[result.order[i]];
    const auto k = static_cast<Eigen::Index>(i);
    lost = lost || !(settled.last.normal(k, k) > 1e-200);
    natural.normal.row(k) /= value;
    natural.normal.col(k) /= value;
  }
  if (lost) {
    std::array<double, kCircuitParameters> one{};
    std::fill_n(one.begin(), n, 1.0);
    equations.look(settled.circuit, std::span<const double>(one).first(n), natural);
  }
  Fit& fit = result.fit;
  fit.parameters.resize(count);
  for (std::size_t i = 0; i < n; ++i) fit.parameters[static_cast<Eigen::Index>(i)] = settled.circuit[result.order[i]];
  fit.stop = settled.stop;
  fit.iterations = settled.iterations;
  fit.reduced_chi_square = result.chi_square / result.dof;
  fit.residual_rms = std::sqrt(result.chi_square / static_cast<double>(points.size()));
  fit.at_bound.assign(n, false);
  std::vector<std::size_t> shown(n);
  std::iota(shown.begin(), shown.end(), 0);
  fit.covariance = inverse_of(natural.normal, shown);
  if (fit.covariance.size() == 0) {
    // What has no slope here and is nearly alike in its effect (losses without phases) cannot be told apart: without those not
    // seen; they keep the variance they have beside all the others, until their limits say more.
    std::erase_if(shown, [&](std::size_t i) {
      const auto k = static_cast<Eigen::Index>(i);
      return settled.last.normal(k, k) < kVisible * result.scale * result.scale;
    });
    fit.covariance = inverse_of(natural.normal, shown);
    if (fit.covariance.size() > 0) {
      const Eigen::MatrixXd some = fit.covariance;
      fit.covariance = Eigen::MatrixXd::Zero(count, count);
      for (Eigen::Index i = 0; i < count; ++i) fit.covariance(i, i) = 1 / std::fmax(natural.normal(i, i), 1e-300);
      for (std::size_t i = 0; i < shown.size(); ++i) {
        for (std::size_t j = 0; j < shown.size(); ++j) {
          fit.covariance(static_cast<Eigen::Index>(shown[i]), static_cast<Eigen::Index>(shown[j])) =
              some(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(j));
        }
      }
    }
  }
  if (fit.covariance.size() > 0) {
    fit.covariance *= result.scale * result.scale;
    const Eigen::VectorXd inverse = fit.parameters.cwiseInverse();
    result.log_covariance = inverse.asDiagonal() * fit.covariance * inverse.asDiagonal();
  } else if (fit.stop == FitStop::converged) {
    fit.stop = FitStop::rank_deficient;
  }
}

}  // namespace

bool CircuitFit::usable() const {
  const Eigen::Index n = fit.parameters.size();
  return fit.stop == FitStop::converged && n > 0 && fit.covariance.rows() == n && fit.parameters.allFinite() &&
         fit.covariance.allFinite() && (fit.covariance.diagonal().array() > 0).all();
}

const CircuitLimit* CircuitFit::limit_of(CircuitParameter parameter) const {
  for (const CircuitLimit& limit : limits) {
    if (limit.parameter == parameter) return &limit;
  }
  return nullptr;
}

bool CircuitFit::seen(CircuitParameter parameter) const {
  return std::find(order.begin(), order.end(), parameter) != order.end() && limit_of(parameter) == nullptr;
}

double CircuitFit::value(CircuitParameter parameter) const { return circuit[parameter]; }

double CircuitFit::standard_uncertainty(CircuitParameter parameter) const {
  const auto at = std::find(order.begin(), order.end(), parameter);
  return at == order.end() ? std::nan("") : fit.standard_uncertainty(static_cast<int>(at - order.begin()));
}

double CircuitFit::variance(std::span<const double> slopes) const {
  const Eigen::Map<const Eigen::VectorXd> s(slopes.data(), static_cast<Eigen::Index>(slopes.size()));
  if (fit.covariance.rows() != s.size()) return std::nan("");
  return s.dot(fit.covariance * s);
}

Eigen::Matrix2d CircuitFit::impedance_covariance(double frequency_hz) const {
  const ImpedanceSlopes at = impedance_slopes(circuit, frequency_hz);
  const auto n = static_cast<Eigen::Index>(at.by_parameter.size());
  if (fit.covariance.rows() != n) return Eigen::Matrix2d::Constant(std::nan(""));
  Eigen::MatrixXd slopes(2, n);
  for (Eigen::Index i = 0; i < n; ++i) {
    slopes(0, i) = at.by_parameter[static_cast<std::size_t>(i)].real();
    slopes(1, i) = at.by_parameter[static_cast<std::size_t>(i)].imag();
  }
  return slopes * fit.covariance * slopes.transpose();
}

double CircuitFit::coverage_factor() const {
  return fit.reduced_chi_square > 0 && scale != 1 ? student_t_quantile(0.975, dof) : normal_quantile(0.975);
}

Result<CircuitFit> fit_circuit(const CircuitData& data, const CircuitFamily& family, const CircuitFitOptions& options) {
  for (const double f : data.frequency_hz) {
    if (!(f > 0) || !std::isfinite(f)) {
      return failure(Problem::bad_number, "sweep", "a frequency is not a positive number", "look at the column of frequencies");
    }
  }
  CircuitFit result;
  result.order = parameters_of(family);
  const auto points = usable_points(data);
  const CircuitEquations equations(data, points, false);
  const double numbers = static_cast<double>(equations.numbers());
  result.phase_used = equations.numbers() > points.size();
  result.dof = numbers - static_cast<double>(result.order.size());
  if (points.size() < 5 || result.dof < 1) {
    return failure(Problem::too_few_samples, "sweep",
                   std::to_string(points.size()) + " usable points, " + std::to_string(result.order.size()) + " elements to find",
                   "measure at 10 frequencies or more, from well below to beyond the resonance if you can");
  }
  const double reference = options.reference_hz > 0 ? options.reference_hz
                                                    : std::sqrt(data.frequency_hz[points.front()] * data.frequency_hz[points.back()]);
  std::optional<Circuit> start = options.start;
  if (!start) start = start_circuit(data, points, family, reference);
  if (!start) {
    return failure(Problem::no_signal, "sweep", "the imaginary part of Z is positive nowhere: no inductance to be seen",
                   "check the sign of the phase, or begin the sweep at a lower frequency");
  }
  double damping = 1e-3;
  if (points.size() > kManyPoints && !options.start) {
    const CircuitEquations some(data, thin_points(points, kManyPoints / 2), false);
    const SettledCircuit nearer = descend(some, *start, 0, kMostIterations, kFewSettled);
    if (nearer.stop == FitStop::converged) start = nearer.circuit, damping = kNearDamping;
  }
  const int most = options.quick ? kQuickIterations : kMostIterations;
  const double settled_at = options.quick ? kQuickSettled : kSettled;
  SettledCircuit settled = descend(equations, *start, 0, most, settled_at, damping);
  rescue(equations, result.phase_used, settled, most, settled_at);
  if ((settled.stop != FitStop::converged && !options.quick) || !std::isfinite(settled.chi)) {
    return failure(Problem::not_converged, "sweep", "no circuit of the kind " + name(family) + " follows the sweep", "");
  }
  fill_statistics(data, points, equations, settled, result);
  if (options.limits && result.usable()) find_limits(equations, result);
  return result;
}

}  // namespace coilassay

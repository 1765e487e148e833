#include "analysis/sweep_joint.h"

#include <Eigen/Cholesky>
#include <Eigen/QR>
#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr int kMostRounds = 60;
constexpr double kSettled = 1e-8;    // of a step, in squared standard uncertainties
constexpr double kLongest = 1.0;     // of a step in a logarithm
constexpr double kSmallest = 1e-9;   // of an element over where it began: as good as not there
constexpr double kDetermined = 1e-8; // of a column, what the others leave of it: below it is rounding
constexpr double kAbsorbed = 0.05;   // of what an error does to the points, left over by the elements that follow it

/// Everything at one circuit: rows of both parts of each point.
class Equations {
 public:
  explicit Equations(const JointProblem& problem) : problem_(problem) {
    const CircuitData& points = problem.points;
    for (std::size_t i = 0; i < points.size(); ++i) {
      if (problem.used[i]) rows_.push_back(i);
    }
    const auto count = static_cast<Eigen::Index>(2 * rows_.size());
    shared_ = Eigen::MatrixXd::Zero(count, static_cast<Eigen::Index>(problem.errors.size()));
    for (std::size_t row = 0; row < rows_.size(); ++row) {
      const std::size_t i = rows_[row];
      for (std::size_t e = 0; e < problem.errors.size(); ++e) {
        // To first order, about what was measured.
        const Complex moved = problem.errors[e].dz_ohm[i] * by_z(points.z[i]);
        const auto k = static_cast<Eigen::Index>(e);
        shared_(row_of(row), k) = moved.real() / u_size(i);
        shared_(row_of(row) + 1, k) = phase(i) ? moved.imag() / u_angle(i) : 0;
      }
    }
  }

  Eigen::Index size() const { return shared_.rows(); }
  const Eigen::MatrixXd& shared() const { return shared_; }
  const std::vector<std::size_t>& rows() const { return rows_; }
  /// Errors that are not fitted.
  void leave_out(const std::vector<Eigen::Index>& errors) {
    for (const Eigen::Index k : errors) shared_.col(k).setZero();
  }

  /// Model less measured, over the noise; derivatives to the natural parameters when asked for.
  Eigen::VectorXd residual(const Circuit& circuit, Eigen::MatrixXd* slopes) const {
    Eigen::VectorXd r(size());
    std::array<Complex, kCircuitParameters> log_slopes;
    for (std::size_t row = 0; row < rows_.size(); ++row) {
      const std::size_t i = rows_[row];
      const Complex z = impedance_and_log_slopes(circuit, problem_.points.frequency_hz[i], log_slopes);
      const Complex measured = problem_.points.z[i];
      const Complex off = reflection() ? s_of(z) - s_of(measured)
                                       : Complex(std::log(std::abs(z) / std::abs(measured)), std::arg(z / measured));
      r[row_of(row)] = off.real() / u_size(i);
      r[row_of(row) + 1] = phase(i) ? off.imag() / u_angle(i) : 0;
      if (slopes == nullptr) continue;
      for (Eigen::Index k = 0; k < slopes->cols(); ++k) {
        Complex slope = log_slopes[static_cast<std::size_t>(k)];
        if (reflection()) slope *= z * by_z(z);
        (*slopes)(row_of(row), k) = slope.real() / u_size(i);
        (*slopes)(row_of(row) + 1, k) = phase(i) ? slope.imag() / u_angle(i) : 0;
      }
    }
    return r;
  }

 private:
  static Eigen::Index row_of(std::size_t row) { return static_cast<Eigen::Index>(2 * row); }
  bool reflection() const { return problem_.points.errors == SweepErrors::reflection; }
  Complex s_of(Complex z) const { return (z - problem_.points.reference_ohm) / (z + problem_.points.reference_ohm); }
  /// d(what the errors are alike in)/dz.
  Complex by_z(Complex z) const {
    if (!reflection()) return 1.0 / z;
    const double r = problem_.points.reference_ohm;
    return 2 * r / ((z + r) * (z + r));
  }
  static double of(const std::vector<double>& u, std::size_t i) { return u.size() == 1 ? u[0] : u[i]; }
  double u_size(std::size_t i) const { return of(problem_.points.u, i); }
  double u_angle(std::size_t i) const {
    return problem_.points.u_phase.empty() || reflection() ? u_size(i) : of(problem_.points.u_phase, i);
  }
  bool phase(std::size_t i) const { return std::isfinite(u_angle(i)); }

  const JointProblem& problem_;
  std::vector<std::size_t> rows_;
  Eigen::MatrixXd shared_;
};

/// N of the header, its parameters in logarithms or natural.
Eigen::MatrixXd normal_of(const Eigen::MatrixXd& slopes, const Equations& equations, const Eigen::MatrixXd& shared_square) {
  const Eigen::Index p = slopes.cols(), e = equations.shared().cols();
  Eigen::MatrixXd n(p + e, p + e);
  n.topLeftCorner(p, p) = slopes.transpose() * slopes;
  n.topRightCorner(p, e) = slopes.transpose() * equations.shared();
  n.bottomLeftCorner(e, p) = n.topRightCorner(p, e).transpose();
  n.bottomRightCorner(e, e) = shared_square;
  return n;
}

/// Columns brought to equal size: the parameters differ by many orders of magnitude.
Eigen::VectorXd units_of(const Eigen::MatrixXd& columns) {
  return columns.colwise().norm().transpose().cwiseMax(std::numeric_limits<double>::min()).cwiseInverse();
}

/// Least squares of each column of `shared` by those of `slopes`: how the elements follow the errors.
Eigen::MatrixXd follow(const Eigen::MatrixXd& slopes, const Eigen::MatrixXd& shared) {
  const Eigen::VectorXd unit = units_of(slopes);
  const Eigen::MatrixXd scaled = slopes * unit.asDiagonal();
  return unit.asDiagonal() * scaled.colPivHouseholderQr().solve(shared);
}

/// Errors the elements can follow entirely, as those of a scale of |Z| or of frequency: no sweep tells anything about them, and
/// what is left over by rounding and by having been taken to first order must not look as if it did.
std::vector<Eigen::Index> absorbed_by(const Eigen::MatrixXd& slopes, const Eigen::MatrixXd& shared) {
  const Eigen::MatrixXd left = shared - slopes * follow(slopes, shared);
  std::vector<Eigen::Index> absorbed;
  for (Eigen::Index k = 0; k < shared.cols(); ++k) {
    if (left.col(k).norm() < kAbsorbed * shared.col(k).norm()) absorbed.push_back(k);
  }
  return absorbed;
}

/// Uncertainty at the end. By orthogonal factors, as squares of the rows would lose what noise is small beside the errors.
void conclude(JointFit& fit, const Eigen::MatrixXd& slopes, const Eigen::MatrixXd& shared, const std::vector<Eigen::Index>& absorbed) {
  const Eigen::Index p = slopes.cols(), e = shared.cols(), n = slopes.rows();
  Eigen::MatrixXd rows = Eigen::MatrixXd::Zero(n + e, p + e);
  rows.topLeftCorner(n, p) = slopes;
  rows.topRightCorner(n, e) = shared;
  rows.bottomRightCorner(e, e).setIdentity();
  for (const Eigen::Index k : absorbed) rows.col(p + k).head(n).setZero();
  const Eigen::VectorXd unit = units_of(rows);
  rows = rows * unit.asDiagonal();
  const Eigen::MatrixXd triangle = Eigen::HouseholderQR<Eigen::MatrixXd>(rows).matrixQR().topRows(p + e);
  const Eigen::MatrixXd root = triangle.triangularView<Eigen::Upper>().solve(Eigen::MatrixXd::Identity(p + e, p + e));
  const Eigen::MatrixXd of_data = rows.topRows(n) * root;
  const Eigen::MatrixXd of_parameters = unit.head(p).asDiagonal() * root.topRows(p);
  // An error not known takes the data with it: the parameters follow by -B, the errors that are fitted by the rest.
  fit.shifts = -(of_parameters * root.bottomRows(e).transpose() * unit.tail(e).asDiagonal());
  fit.covariance = of_parameters * (of_data.transpose() * of_data) * of_parameters.transpose();
  const Eigen::MatrixXd following = follow(slopes, shared);
  for (const Eigen::Index k : absorbed) fit.shifts.col(k) = following.col(k);
  if (!(triangle.diagonal().cwiseAbs().minCoeff() > kDetermined)) fit.covariance.setConstant(std::nan(""));
}

}  // namespace

JointFit fit_jointly(const JointProblem& problem, const Circuit& start) {
  Equations equations(problem);
  const Eigen::MatrixXd shared = equations.shared();
  JointFit fit;
  fit.circuit = start;
  fit.order = parameters_of(start.family);
  const auto p = static_cast<Eigen::Index>(fit.order.size());
  const Eigen::Index e = equations.shared().cols();
  fit.errors = Eigen::VectorXd::Zero(e);

  Eigen::MatrixXd slopes(equations.size(), p), logs(equations.size(), p);
  equations.residual(start, &slopes);
  const std::vector<Eigen::Index> absorbed = absorbed_by(slopes, equations.shared());
  equations.leave_out(absorbed);
  Eigen::MatrixXd shared_square = equations.shared().transpose() * equations.shared();
  shared_square.diagonal().array() += 1;
  const auto cost = [&](const Circuit& circuit, const Eigen::VectorXd& errors) {
    return (equations.residual(circuit, nullptr) + equations.shared() * errors).squaredNorm() + errors.squaredNorm();
  };
  double damping = 1e-4, best = cost(fit.circuit, fit.errors);
  for (int round = 0; round < kMostRounds && !fit.settled; ++round) {
    const Eigen::VectorXd r = equations.residual(fit.circuit, &slopes) + equations.shared() * fit.errors;
    for (Eigen::Index k = 0; k < p; ++k) logs.col(k) = slopes.col(k) * fit.circuit[fit.order[static_cast<std::size_t>(k)]];
    const Eigen::MatrixXd normal = normal_of(logs, equations, shared_square);
    Eigen::VectorXd gradient(p + e);
    gradient << logs.transpose() * r, equations.shared().transpose() * r + fit.errors;
    bool better = false;
    for (int attempt = 0; attempt < 12 && !better; ++attempt) {
      Eigen::MatrixXd damped = normal;
      damped.diagonal().array() += damping * normal.diagonal().array() + 1e-12 * normal.diagonal().maxCoeff();
      const Eigen::VectorXd step = damped.ldlt().solve(-gradient);
      Circuit next = fit.circuit;
      for (Eigen::Index k = 0; k < p; ++k) {
        const CircuitParameter name = fit.order[static_cast<std::size_t>(k)];
        double value = fit.circuit[name] * std::exp(std::clamp(step[k], -kLongest, kLongest));
        if (name == CircuitParameter::relaxation_share) value = std::fmin(value, 1);
        next[name] = std::fmax(value, kSmallest * start[name]);
      }
      const Eigen::VectorXd errors = fit.errors + step.tail(e);
      const double now = cost(next, errors);
      if (std::isfinite(now) && now <= best) {
        better = true;
        fit.settled = best - now < kSettled * (1 + best);
        fit.circuit = next;
        fit.errors = errors;
        best = now;
        damping = std::fmax(damping / 10, 1e-12);
      } else {
        damping = std::fmin(damping * 10, 1e8);
      }
    }
    if (!better) fit.settled = true;   // no way down is left
  }
  fit.chi_square = best;
  fit.dof = static_cast<double>(equations.size()) - static_cast<double>(p);

  const Eigen::VectorXd r = equations.residual(fit.circuit, &slopes) + equations.shared() * fit.errors;
  conclude(fit, slopes, shared, absorbed);
  fit.settled = fit.settled && fit.covariance.allFinite() && fit.shifts.allFinite() && (fit.covariance.diagonal().array() > 0).all();
  fit.residual.assign(problem.points.size(), {std::nan(""), std::nan("")});
  for (std::size_t row = 0; row < equations.rows().size(); ++row) {
    const auto k = static_cast<Eigen::Index>(2 * row);
    fit.residual[equations.rows()[row]] = {r[k], r[k + 1]};
  }
  return fit;
}

std::vector<Complex> without_errors(const JointProblem& problem, const JointFit& fit) {
  std::vector<Complex> z = problem.points.z;
  const double r = problem.points.reference_ohm;
  for (std::size_t i = 0; i < z.size(); ++i) {
    Complex moved = 0;
    for (std::size_t e = 0; e < problem.errors.size(); ++e) moved += fit.errors[static_cast<Eigen::Index>(e)] * problem.errors[e].dz_ohm[i];
    // In the space where the errors are small: near an open a small error of S is a large one of Z.
    if (problem.points.errors == SweepErrors::reflection) {
      const Complex s = (z[i] - r) / (z[i] + r) - moved * 2.0 * r / ((z[i] + r) * (z[i] + r));
      z[i] = r * (1.0 + s) / (1.0 - s);
    } else {
      z[i] *= std::exp(-moved / z[i]);
    }
  }
  return z;
}

}  // namespace coilassay

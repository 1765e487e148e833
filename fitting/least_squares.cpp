#include "fitting/least_squares.h"

#include <ceres/ceres.h>
#include <fmt/format.h>
#include <gflags/gflags.h>
#include <glog/logging.h>

#include <Eigen/QR>
#include <algorithm>
#include <cassert>
#include <cmath>
#include <memory>
#include <mutex>

namespace coilassay {
namespace {

// Ceres reports failures through glog on standard error; only the program prints.
void silence_library_log() {
  static std::once_flag once;
  std::call_once(once, [] {
    FLAGS_minloglevel = 3;
    if (!google::IsGoogleLoggingInitialized()) google::InitGoogleLogging("coilassay");
  });
}

bool all_finite(std::span<const double> values) {
  return std::all_of(values.begin(), values.end(), [](double v) { return std::isfinite(v); });
}

// Residuals first .. first + count - 1 of a model that computes all of them at once. The values of the latest
// parameters are shared among blocks: a robust fit has one block per residual, because a loss acts on a block.
class Shared {
 public:
  Shared(const ResidualFunction& residuals, std::size_t count, std::size_t parameters)
      : residuals_(residuals), parameters_(parameters), values_(count), jacobian_(count * parameters) {}

  bool compute(const double* at, bool with_jacobian) {
    const std::span<const double> p(at, parameters_);
    if (known_ && (!with_jacobian || has_jacobian_) && std::equal(p.begin(), p.end(), last_.begin())) return usable_;
    last_.assign(p.begin(), p.end());
    known_ = true;
    has_jacobian_ = with_jacobian;
    usable_ = residuals_(p, values_, with_jacobian ? std::span<double>(jacobian_) : std::span<double>()) &&
              all_finite(values_) && (!with_jacobian || all_finite(jacobian_));
    return usable_;
  }
  const std::vector<double>& values() const { return values_; }
  const std::vector<double>& jacobian() const { return jacobian_; }

 private:
  const ResidualFunction& residuals_;
  std::size_t parameters_;
  std::vector<double> values_, jacobian_, last_;
  bool known_ = false, has_jacobian_ = false, usable_ = false;
};

class Slice final : public ceres::CostFunction {
 public:
  Slice(Shared& shared, std::size_t first, std::size_t count, std::size_t parameters)
      : shared_(shared), first_(first), count_(count), parameters_(parameters) {
    set_num_residuals(static_cast<int>(count));
    mutable_parameter_block_sizes()->push_back(static_cast<int>(parameters));
  }
  bool Evaluate(double const* const* parameters, double* residuals, double** jacobians) const override {
    const bool with_jacobian = jacobians != nullptr && jacobians[0] != nullptr;
    if (!shared_.compute(parameters[0], with_jacobian)) return false;
    std::copy_n(shared_.values().begin() + static_cast<std::ptrdiff_t>(first_), count_, residuals);
    if (with_jacobian) {
      std::copy_n(shared_.jacobian().begin() + static_cast<std::ptrdiff_t>(first_ * parameters_), count_ * parameters_,
                  jacobians[0]);
    }
    return true;
  }

 private:
  Shared& shared_;
  std::size_t first_, count_, parameters_;
};

FitStop stop_of(const ceres::Solver::Summary& summary) {
  switch (summary.termination_type) {
    case ceres::CONVERGENCE: return FitStop::converged;
    case ceres::NO_CONVERGENCE: return FitStop::max_iterations;
    case ceres::FAILURE:
    case ceres::USER_SUCCESS:
    case ceres::USER_FAILURE: break;
  }
  return FitStop::failed;
}

// A parameter that sits on its bound still has a normal-looking variance: it has to be looked for.
std::vector<bool> at_bounds(const Eigen::VectorXd& p, const LeastSquaresOptions& options) {
  std::vector<bool> result(static_cast<std::size_t>(p.size()), false);
  for (std::size_t i = 0; i < result.size(); ++i) {
    const double value = p[static_cast<Eigen::Index>(i)];
    const auto near = [value](double bound, double other) {
      const double scale = std::isfinite(other) ? std::abs(bound - other) : std::max(std::abs(bound), std::abs(value));
      return std::isfinite(bound) && std::abs(value - bound) <= 1e-9 * std::max(scale, 1e-300);
    };
    const double low = options.lower.empty() ? -std::numeric_limits<double>::infinity() : options.lower[i];
    const double high = options.upper.empty() ? std::numeric_limits<double>::infinity() : options.upper[i];
    result[i] = near(low, high) || near(high, low);
  }
  return result;
}

// (J^T W J)^-1, or empty when a direction is not determined. On columns of unit length, so that units do not matter.
Eigen::MatrixXd inverse_information(const Eigen::MatrixXd& jacobian) {
  const Eigen::VectorXd length = jacobian.colwise().norm();
  if (!(length.array() > 0).all() || !length.allFinite()) return {};
  const Eigen::MatrixXd unit = jacobian * length.cwiseInverse().asDiagonal();
  // QR rather than J^T J: the certified problems have condition numbers whose square is beyond double precision.
  const Eigen::ColPivHouseholderQR<Eigen::MatrixXd> qr(unit);
  const Eigen::Index n = jacobian.cols();
  const Eigen::VectorXd diagonal = qr.matrixR().diagonal().cwiseAbs();
  if (jacobian.rows() < n || diagonal.minCoeff() < 1e-12 * diagonal.maxCoeff()) return {};
  const Eigen::MatrixXd r_inverse =
      qr.matrixR().topLeftCorner(n, n).template triangularView<Eigen::Upper>().solve(Eigen::MatrixXd::Identity(n, n));
  const Eigen::MatrixXd scaled = qr.colsPermutation() * r_inverse;
  const Eigen::MatrixXd rows = length.cwiseInverse().asDiagonal() * scaled;
  return rows * rows.transpose();
}

// Scale of the residuals that outliers do not move: 1.4826 times the median of their magnitudes.
double spread(std::vector<double> residuals) {
  for (double& r : residuals) r = std::abs(r);
  const auto middle = residuals.begin() + static_cast<std::ptrdiff_t>(residuals.size() / 2);
  std::nth_element(residuals.begin(), middle, residuals.end());
  return 1.4826 * *middle;
}

// bend 0: plain least squares, one block; otherwise soft L1 beyond `bend`, each residual by itself.
ceres::Solver::Summary solve(Shared& shared, std::vector<double>& p, std::size_t m, double bend,
                             const LeastSquaresOptions& options) {
  ceres::Problem problem;
  if (bend > 0) {
    for (std::size_t k = 0; k < m; ++k) {
      problem.AddResidualBlock(new Slice(shared, k, 1, p.size()), new ceres::SoftLOneLoss(bend), p.data());
    }
  } else {
    problem.AddResidualBlock(new Slice(shared, 0, m, p.size()), nullptr, p.data());
  }
  for (std::size_t i = 0; i < p.size(); ++i) {
    const int index = static_cast<int>(i);
    if (!options.lower.empty()) problem.SetParameterLowerBound(p.data(), index, options.lower[i]);
    if (!options.upper.empty()) problem.SetParameterUpperBound(p.data(), index, options.upper[i]);
  }
  ceres::Solver::Options solver;
  solver.linear_solver_type = ceres::DENSE_QR;
  solver.max_num_iterations = options.max_iterations;
  solver.function_tolerance = options.function_tolerance;
  solver.parameter_tolerance = options.parameter_tolerance;
  solver.gradient_tolerance = options.gradient_tolerance;
  solver.logging_type = ceres::SILENT;
  solver.num_threads = 1;  // the same digits every time
  ceres::Solver::Summary summary;
  ceres::Solve(solver, &problem, &summary);
  return summary;
}

// Ceres stops when the cost no longer changes, where parameters are known to half as many digits; a few Gauss-Newton
// steps find the rest. They end when a step is not shorter than the one before.
void polish(Shared& shared, std::vector<double>& p, std::size_t m, const LeastSquaresOptions& options) {
  using RowMajor = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;
  const auto rows = static_cast<Eigen::Index>(m), columns = static_cast<Eigen::Index>(p.size());
  if (m < p.size()) return;
  double shortest = std::numeric_limits<double>::infinity();
  std::vector<double> best = p;
  for (int round = 0; round < 6; ++round) {
    if (!shared.compute(p.data(), true)) break;
    const Eigen::MatrixXd jacobian = Eigen::Map<const RowMajor>(shared.jacobian().data(), rows, columns);
    const Eigen::Map<const Eigen::VectorXd> residuals(shared.values().data(), rows);
    const Eigen::VectorXd length = jacobian.colwise().norm();
    if (!(length.array() > 0).all() || !length.allFinite()) break;
    const Eigen::ColPivHouseholderQR<Eigen::MatrixXd> qr(jacobian * length.cwiseInverse().asDiagonal());
    if (qr.rank() < columns) break;
    const Eigen::VectorXd scaled = qr.solve(-residuals);
    // Length of the step in the space of residuals: it shrinks as long as the steps are worth taking.
    const double reach = scaled.norm();
    if (!std::isfinite(reach) || reach >= shortest || reach > 1e-3 * residuals.norm()) break;
    shortest = reach;
    best = p;
    for (std::size_t i = 0; i < p.size(); ++i) {
      p[i] += scaled[static_cast<Eigen::Index>(i)] / length[static_cast<Eigen::Index>(i)];
      if (!options.lower.empty() && p[i] < options.lower[i]) p[i] = options.lower[i];
      if (!options.upper.empty() && p[i] > options.upper[i]) p[i] = options.upper[i];
    }
    if (reach < 1e-14 * residuals.norm()) return;
  }
  p = best;
}

// Residual figures and covariance at the solution, whose values and Jacobian `shared` holds.
void judge(const Shared& shared, std::size_t m, std::size_t n, double bend, const LeastSquaresOptions& options,
           Fit& fit) {
  using RowMajor = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;
  const Eigen::MatrixXd jacobian =
      Eigen::Map<const RowMajor>(shared.jacobian().data(), static_cast<Eigen::Index>(m), static_cast<Eigen::Index>(n));
  // Ceres' final_cost holds the loss; the variances are made from the residuals themselves. With the soft L1 loss a
  // residual pulls like psi = r w, w = (1 + (r/bend)^2)^(-1/2), and psi changes with r like w^3.
  double plain = 0, weighted = 0, weights = 0, pull = 0;
  Eigen::MatrixXd bent = jacobian;
  for (std::size_t k = 0; k < m; ++k) {
    const double r = shared.values()[k];
    const double ratio = bend > 0 ? r / bend : 0;
    const double w = 1 / std::sqrt(1 + ratio * ratio);
    plain += r * r;
    weighted += w * r * r;
    weights += w;
    pull += w * w * r * r;
    bent.row(static_cast<Eigen::Index>(k)) *= std::pow(w, 1.5);
  }
  fit.residual_rms = std::sqrt(plain / static_cast<double>(m));
  const double dof = weights - static_cast<double>(n);
  fit.reduced_chi_square = dof > 0 ? weighted / dof : std::nan("");
  const Eigen::MatrixXd inverse = inverse_information(bent);
  if (inverse.size() == 0) {
    if (fit.stop == FitStop::converged) fit.stop = FitStop::rank_deficient;
    return;
  }
  const bool scalable = m > n;
  if (bend > 0 && scalable) {
    const Eigen::MatrixXd half = jacobian * inverse;
    fit.covariance = half.transpose() * half * (pull / static_cast<double>(m - n));
  } else if (options.known_sigma) {
    fit.covariance = inverse;
  } else if (scalable) {
    fit.covariance = inverse * fit.reduced_chi_square;
  }
}

}  // namespace

Result<Fit> minimise(const ResidualFunction& residuals, int residual_count, std::span<const double> start,
                     const LeastSquaresOptions& options) {
  assert(residual_count > 0 && !start.empty());
  assert(options.lower.empty() || options.lower.size() == start.size());
  assert(options.upper.empty() || options.upper.size() == start.size());
  silence_library_log();
  const std::size_t m = static_cast<std::size_t>(residual_count), n = start.size();
  std::vector<double> p(start.begin(), start.end());
  for (std::size_t i = 0; i < n; ++i) {
    // Ceres refuses a start outside the bounds.
    if (!options.lower.empty()) p[i] = std::max(p[i], options.lower[i]);
    if (!options.upper.empty()) p[i] = std::min(p[i], options.upper[i]);
  }
  Shared shared(residuals, m, n);
  if (!all_finite(p) || !shared.compute(p.data(), true)) {
    return failure(Problem::bad_number, "", "the model is not finite at the start of the fit",
                   "check the values for missing or infinite numbers, or give another start");
  }
  const bool robust = options.robust_scale > 0;
  double bend = robust && options.known_sigma ? options.robust_scale : 0;
  Fit fit;
  ceres::Solver::Summary summary = solve(shared, p, m, bend, options);
  fit.iterations = static_cast<int>(summary.iterations.size());
  if (robust && !options.known_sigma) {
    // The scale in residual units follows from the residuals, the residuals from the fit: a few rounds agree.
    for (int round = 0; round < 10 && shared.compute(p.data(), false); ++round) {
      const double next = options.robust_scale * spread(shared.values());
      if (!(next > 0) || std::abs(next - bend) < 1e-3 * next) break;
      bend = next;
      summary = solve(shared, p, m, bend, options);
      fit.iterations += static_cast<int>(summary.iterations.size());
    }
  }
  if (bend == 0 && summary.termination_type == ceres::CONVERGENCE) polish(shared, p, m, options);
  fit.parameters = Eigen::Map<const Eigen::VectorXd>(p.data(), static_cast<Eigen::Index>(n));
  fit.stop = stop_of(summary);
  fit.at_bound = at_bounds(fit.parameters, options);
  if (shared.compute(p.data(), true)) {
    judge(shared, m, n, bend, options, fit);
  } else {
    fit.stop = FitStop::failed;
  }
  return fit;
}

}  // namespace coilassay

// Non-linear least squares behind one door. A model is a functor templated on its scalar; derivatives are exact.
#pragma once

#include <ceres/jet.h>

#include <Eigen/Core>
#include <array>
#include <functional>
#include <limits>
#include <span>
#include <vector>

#include "base/result.h"
#include "fitting/fit.h"

namespace coilassay {

struct LeastSquaresOptions {
  int max_iterations = 2000;  // flat valleys need many, and most stop long before
  double function_tolerance = 1e-14;
  double parameter_tolerance = 1e-12;
  double gradient_tolerance = 1e-14;
  std::vector<double> lower{}, upper{};  // empty: none; else one per parameter
  /// 0: plain least squares. Otherwise residuals beyond this many sigma count less (soft L1), each residual its own.
  double robust_scale = 0;
  /// true: residuals are already divided by known sigmas and the covariance is taken as it is;
  /// false: the covariance is scaled by the residual variance.
  bool known_sigma = false;
};

/// Type-erased residuals: fills r (m) and, unless J is empty, the Jacobian (m x n, row-major). False: not computable
/// there.
using ResidualFunction =
    std::function<bool(std::span<const double> parameters, std::span<double> residuals, std::span<double> jacobian)>;

/// The engine of fit_least_squares, for models whose derivatives come from elsewhere.
Result<Fit> minimise(const ResidualFunction& residuals, int residual_count, std::span<const double> start,
                     const LeastSquaresOptions& options);

/// Stops converged, max_iterations or failed (the model became not computable); rank_deficient when it converged but
/// the data leave a direction of the parameters open, and then there is no covariance. A parameter on its bound is
/// marked in at_bound: its variance means nothing. Robust: the covariance is that of the M-estimator (J^T D J)^-1 s^2
/// J^T J (J^T D J)^-1, D the slope of the influence, s^2 its variance; reduced_chi_square counts residuals by their
/// weight.
///
/// Fits N parameters of a model: `template <class T> bool operator()(const T* parameters, T* residuals) const`.
///
/// @return the fit, also when it is not usable(); rank_deficient or not_converged only through Fit::stop.
///         bad_number when the model is not finite at the start.
template <int N, class Model>
Result<Fit> fit_least_squares(const Model& model, int residual_count, std::span<const double> start,
                              const LeastSquaresOptions& options = {}) {
  using Jet = ceres::Jet<double, N>;
  const ResidualFunction residuals = [&model, residual_count](std::span<const double> p, std::span<double> r,
                                                              std::span<double> jacobian) {
    if (jacobian.empty()) return model(p.data(), r.data());
    std::array<Jet, static_cast<std::size_t>(N)> parameters;
    for (std::size_t i = 0; i < parameters.size(); ++i) parameters[i] = Jet(p[i], static_cast<int>(i));
    std::vector<Jet> values(static_cast<std::size_t>(residual_count));
    if (!model(static_cast<const Jet*>(parameters.data()), values.data())) return false;
    for (std::size_t k = 0; k < values.size(); ++k) {
      r[k] = values[k].a;
      for (int i = 0; i < N; ++i) jacobian[k * N + static_cast<std::size_t>(i)] = values[k].v[i];
    }
    return true;
  };
  return minimise(residuals, residual_count, start, options);
}

}  // namespace coilassay

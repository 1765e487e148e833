// Weighted least squares of a few parameters by many kinds of observation, some parameters perhaps left open by all of them.
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <functional>
#include <span>
#include <vector>

namespace coilassay {

/// Residuals in units of their standard uncertainty: (observed - predicted)/u. False: not computable there.
using JointResiduals = std::function<bool(std::span<const double> parameters, std::span<double> residuals)>;

struct JointProblem {
  std::size_t residual_count = 0;
  JointResiduals residuals;
  std::vector<double> scale;   // of each parameter: a change that matters; derivatives are taken over a small part of it
  std::vector<bool> fixed;     // empty: none
};

/// All that the fit knows. Directions of the parameters that no observation touches are left where they started and counted
/// in `open`; covariance and gain are those of the minimum-norm solution in the scaled parameters, so that a function of the
/// parameters which has no slope along an open direction has its right uncertainty.
struct JointFit {
  Eigen::VectorXd parameters;
  Eigen::VectorXd residuals;
  Eigen::MatrixXd covariance;   // of unit-variance residuals
  Eigen::MatrixXd gain;         // parameters x residuals: what an error of one standard uncertainty in each does
  Eigen::MatrixXd open;         // orthonormal columns in scaled parameters; none when all is determined
  double chi_square = 0;
  std::size_t rank = 0;
  int iterations = 0;
  bool converged = false;
};

/// Levenberg and Marquardt with central differences; a direction whose singular value is below 1e-7 of the largest is open.
/// The start must be computable (else converged is false and chi_square is NaN).
JointFit fit_jointly(const JointProblem& problem, std::span<const double> start);

/// Whether a function with this gradient (over the unscaled parameters) is determined by the observations: its slope along
/// the open directions is below 1e-5 of its whole slope.
bool determined(const JointFit& fit, std::span<const double> scale, const Eigen::VectorXd& gradient);

/// By how much chi-square would fall from here, as the quadratic of all free parameters promises; NaN when not computable.
double promised_drop(const JointProblem& problem, std::span<const double> at);

/// The smallest chi-square with one parameter held at a value, the others free; NaN when not computable.
double profile_chi_square(const JointProblem& problem, const JointFit& fit, std::size_t parameter, double value);

}  // namespace coilassay

// The circuit of a sweep and the errors of its analyser, fitted together. Internal to this room.
#pragma once

#include <Eigen/Core>
#include <vector>

#include "analysis/sweep_data.h"

namespace coilassay {

/// What is to be explained: points with their noise, and what each shared error does to them.
struct JointProblem {
  const CircuitData& points;                  // u, u_phase: standard deviations by noise alone
  std::vector<bool> used;
  const std::vector<ImpedanceErrorTerm>& errors;
};

/// Minimum over circuit and errors: the residuals over the noise, squared, and each error over its standard uncertainty,
/// squared. What an analyser may do to all points alike is so tried as an explanation before any element is.
struct JointFit {
  Circuit circuit;
  std::vector<CircuitParameter> order;
  Eigen::VectorXd errors;                     // most likely, in standard uncertainties
  Eigen::MatrixXd covariance;                 // of the natural parameters, by the noise
  Eigen::MatrixXd shifts;                     // of the parameters (rows) by one standard uncertainty of each error (columns)
  double chi_square = 0, dof = 0;             // errors counted as data and as unknowns
  bool settled = false;
  std::vector<std::complex<double>> residual; // over the noise, the errors taken out; NaN where a point is not used
};

/// Gauss and Newton over the logarithms of the elements, from a circuit nearby.
///
/// With J the derivatives of the residuals to the parameters and T those to the errors, both over the noise, and
/// N = [J'J, J'T; T'J, T'T + 1]: N^-1's blocks give the covariance by noise A - B B' and the shifts by the errors -B, where A is the
/// block of the parameters and B that between parameters and errors (docs/formulas.md#errors-shared-by-all-points).
///
/// An error that the elements follow entirely, as that of a scale of |Z| or of frequency, is not fitted: nothing can be learnt about
/// it. The parameters follow it by the least squares of its column of T by J.
JointFit fit_jointly(const JointProblem& problem, const Circuit& start);

/// The points with the most likely errors taken out.
std::vector<std::complex<double>> without_errors(const JointProblem& problem, const JointFit& fit);

}  // namespace coilassay

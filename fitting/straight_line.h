// Straight lines: by least squares where x is known exactly, and by groups where it has errors of its own.
#pragma once

#include <Eigen/Core>
#include <cmath>
#include <span>

namespace coilassay {

struct StraightLine {
  double intercept = std::nan(""), slope = std::nan("");
  double u_intercept = std::nan(""), u_slope = std::nan("");  // from the scatter; NaN when there is none to see
  double correlation = std::nan("");
  double residual_deviation = std::nan("");  // of a point of weight 1
  double dof = 0;

  double at(double x) const { return intercept + slope * x; }
  double standard_uncertainty_at(double x) const;
};

/// y = intercept + slope x by weighted least squares, in two passes about the weighted means, so that a large common part
/// of x or y costs no digits (JCGM 100, H.3).
///
/// @param weights  inverse variances but for a common factor, > 0; empty: all equal
/// @return NaN throughout when fewer than two x differ; no uncertainties from two points
StraightLine fit_straight_line(std::span<const double> x, std::span<const double> y, std::span<const double> weights = {});

/// Coefficients of y = X b, with covariance.
struct LinearFit {
  Eigen::VectorXd parameters;
  Eigen::MatrixXd per_variance;  // the covariance is this times the variance of a point of weight 1
  Eigen::VectorXd residuals;     // y - X b
  double residual_deviation = std::nan("");
  double dof = 0;

  bool usable() const { return parameters.size() > 0 && parameters.allFinite(); }
  double standard_uncertainty(Eigen::Index parameter, double deviation) const {
    return deviation * std::sqrt(per_variance(parameter, parameter));
  }
};

/// Linear fit when X has noise: b solves Z^T W (y - X b) = 0 with instruments Z, as many as X has columns, that know of X but
/// not of its noise (which group a point belongs to, when it was taken). With Z = X it is weighted least squares, whose
/// slope is too small by the share of the noise in the variance of x; by groups it is not: for a line and a
/// z of -1 and 1 the slope is the difference of the means of y over that of x (A. Wald, 1940; formula from memory, checked
/// by computing).
/// Covariance s^2 A^-1 (Z^T W Z) A^-T with A = Z^T W X.
/// @return no parameters when A is singular
LinearFit fit_by_instruments(const Eigen::MatrixXd& x, const Eigen::MatrixXd& z, const Eigen::VectorXd& y,
                             const Eigen::VectorXd& weights);

}  // namespace coilassay

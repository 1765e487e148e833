#include "fitting/straight_line.h"

#include <Eigen/LU>
#include <cassert>

namespace coilassay {

double StraightLine::standard_uncertainty_at(double x) const {
  const double moved = x * u_slope;
  return std::sqrt(u_intercept * u_intercept + moved * moved + 2 * correlation * u_intercept * moved);
}

StraightLine fit_straight_line(std::span<const double> x, std::span<const double> y, std::span<const double> weights) {
  assert(x.size() == y.size() && (weights.empty() || weights.size() == x.size()));
  const auto w = [&](std::size_t i) { return weights.empty() ? 1.0 : weights[i]; };
  StraightLine line;
  double s = 0, sx = 0, sy = 0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    s += w(i);
    sx += w(i) * x[i];
    sy += w(i) * y[i];
  }
  const double mean_x = sx / s, mean_y = sy / s;
  double sxx = 0, sxy = 0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    sxx += w(i) * (x[i] - mean_x) * (x[i] - mean_x);
    sxy += w(i) * (x[i] - mean_x) * (y[i] - mean_y);
  }
  if (!(sxx > 0)) return line;
  line.slope = sxy / sxx;
  line.intercept = mean_y - line.slope * mean_x;
  if (x.size() < 3) return line;

  double chi = 0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    const double r = y[i] - mean_y - line.slope * (x[i] - mean_x);
    chi += w(i) * r * r;
  }
  line.dof = static_cast<double>(x.size() - 2);
  line.residual_deviation = std::sqrt(chi / line.dof);
  line.u_slope = line.residual_deviation / std::sqrt(sxx);
  line.u_intercept = line.residual_deviation * std::sqrt(1 / s + mean_x * mean_x / sxx);
  line.correlation = -mean_x / std::sqrt(sxx / s + mean_x * mean_x);
  return line;
}

LinearFit fit_by_instruments(const Eigen::MatrixXd& x, const Eigen::MatrixXd& z, const Eigen::VectorXd& y,
                             const Eigen::VectorXd& weights) {
  assert(x.rows() == y.size() && z.rows() == y.size() && z.cols() == x.cols() && weights.size() == y.size());
  LinearFit fit;
  const Eigen::MatrixXd weighted = weights.asDiagonal() * z;
  const Eigen::MatrixXd a = weighted.transpose() * x;
  // Rows and columns to a common size first: volts, amperes and reading numbers differ by many orders.
  const Eigen::VectorXd rows = a.cwiseAbs().rowwise().maxCoeff();
  const Eigen::VectorXd columns = a.cwiseAbs().colwise().maxCoeff();
  if (!(rows.minCoeff() > 0) || !(columns.minCoeff() > 0)) return fit;
  const Eigen::VectorXd column_scale = columns.cwiseInverse();
  const Eigen::VectorXd row_scale = (a * column_scale.asDiagonal()).cwiseAbs().rowwise().maxCoeff().cwiseInverse();
  const Eigen::FullPivLU<Eigen::MatrixXd> lu(row_scale.asDiagonal() * a * column_scale.asDiagonal());
  if (!lu.isInvertible()) return fit;
  const Eigen::MatrixXd inverse = column_scale.asDiagonal() * lu.inverse() * row_scale.asDiagonal();

  fit.parameters = inverse * (weighted.transpose() * y);
  // Once more for what rounding left.
  fit.parameters += inverse * (weighted.transpose() * (y - x * fit.parameters));
  fit.residuals = y - x * fit.parameters;
  fit.per_variance = inverse * (z.transpose() * weighted) * inverse.transpose();
  fit.dof = static_cast<double>(y.size() - x.cols());
  if (fit.dof > 0) {
    fit.residual_deviation = std::sqrt(fit.residuals.cwiseAbs2().dot(weights) / fit.dof);
  }
  return fit;
}

}  // namespace coilassay

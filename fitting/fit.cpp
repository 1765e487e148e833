#include "fitting/fit.h"

#include <cassert>
#include <cmath>
#include <limits>

namespace coilassay {

std::string_view name(FitStop stop) {
  switch (stop) {
    case FitStop::converged: return "converged";
    case FitStop::max_iterations: return "max_iterations";
    case FitStop::failed: return "failed";
    case FitStop::rank_deficient: return "rank_deficient";
  }
  assert(false && "a FitStop outside its list");
  return "";
}

bool Fit::usable() const {
  if (stop != FitStop::converged) return false;
  for (const bool bound : at_bound) {
    if (bound) return false;
  }
  const Eigen::Index n = parameters.size();
  if (n == 0 || covariance.rows() != n || covariance.cols() != n) return false;
  return parameters.allFinite() && covariance.allFinite() && (covariance.diagonal().array() > 0).all();
}

double Fit::standard_uncertainty(int parameter) const {
  assert(parameter >= 0 && parameter < parameters.size());
  if (covariance.rows() != parameters.size()) return std::numeric_limits<double>::quiet_NaN();
  return std::sqrt(covariance(parameter, parameter));
}

double Fit::correlation(int a, int b) const {
  assert(a >= 0 && a < parameters.size() && b >= 0 && b < parameters.size());
  if (covariance.rows() != parameters.size()) return std::numeric_limits<double>::quiet_NaN();
  return covariance(a, b) / std::sqrt(covariance(a, a) * covariance(b, b));
}

}  // namespace coilassay

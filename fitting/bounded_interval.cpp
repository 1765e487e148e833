#include "fitting/bounded_interval.h"

#include <algorithm>
#include <cmath>

namespace coilassay {

namespace {

constexpr double kOneSided = 1.6448536269514722;
constexpr double kTwoSided = 1.959963984540054;

double normal_below(double x) { return std::erfc(-x / std::sqrt(2.0)) / 2; }

/// Share of estimates, normal around a value `distance` above the boundary, that keep it when the ratio is cut at factor^2.
double kept(double distance, double factor) {
  const double lower = distance >= factor ? -factor : (distance * distance - factor * factor) / (2 * distance) - distance;
  return normal_below(factor) - normal_below(lower);
}

}  // namespace

double boundary_factor(double distance) {
  if (!(distance > 1e-9)) return kOneSided;
  if (distance >= kTwoSided) return kTwoSided;
  double below = kOneSided - 1e-12, above = kTwoSided;
  for (int i = 0; i < 50; ++i) {
    const double middle = (below + above) / 2;
    (kept(distance, middle) < 0.95 ? below : above) = middle;
  }
  return (below + above) / 2;
}

BoundedInterval bounded_interval(const BoundedRequest& q, const std::function<double(double)>& chi_square) {
  BoundedInterval result;
  result.best = std::clamp(q.best, q.low, q.high);
  const double least = chi_square(result.best);
  const auto factor = [&](double x) {
    const double distance = std::fmin(x - q.low, q.high - x) / q.u;
    const double part = (boundary_factor(distance) - kOneSided) / (kTwoSided - kOneSided);
    return q.factor_one_sided + part * (q.factor_two_sided - q.factor_one_sided);
  };
  const auto inside = [&](double x) {
    const double rise = chi_square(x) - least;
    const double f = factor(x);
    return std::isfinite(rise) && rise <= f * f;
  };
  const auto edge = [&](double direction, double limit, bool& at_limit) {
    // Outward by growing steps until outside, then halving.
    double in = result.best, step = q.u;
    for (int i = 0; i < 60; ++i) {
      const double out = direction > 0 ? std::fmin(in + step, limit) : std::fmax(in - step, limit);
      if (inside(out)) {
        if (out == limit) {
          at_limit = true;
          return limit;
        }
        in = out;
        step *= 1.5;
        continue;
      }
      double a = in, b = out;
      for (int k = 0; k < 40 && std::fabs(b - a) > 1e-5 * q.u; ++k) {
        const double middle = (a + b) / 2;
        (inside(middle) ? a : b) = middle;
      }
      return a;
    }
    return in;
  };
  if (!(q.u > 0)) {
    result.low = result.high = result.best;
    return result;
  }
  result.low = edge(-1, q.low, result.at_low);
  result.high = edge(+1, q.high, result.at_high);
  return result;
}

}  // namespace coilassay

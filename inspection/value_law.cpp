#include "inspection/value_law.h"

#include <algorithm>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <limits>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr double kSqrt3 = 1.7320508075688772;
constexpr double kManyDof = 1e6;

double density(double z) { return std::exp(-z * z / 2) / std::sqrt(2 * M_PI); }

/// Upper tail of a normal law, exact far out.
double normal_tail(double z) { return std::erfc(z / std::sqrt(2.0)) / 2; }

/// Integral of the normal tail from z on: density(z) - z tail(z), by its own digits.
double tail_integral(double z) {
  if (z > 30) return 0;
  return density(z) - z * normal_tail(z);
}

/// Upper tail at t standard uncertainties of a sum of a rectangular and a normal error; `flat` is the rectangular share of
/// the variance.
double flat_tail(double t, double flat) {
  if (flat <= 0) return normal_tail(t);
  const double a = kSqrt3 * std::sqrt(flat), s = std::sqrt(std::max(1 - flat, 0.0));
  if (s < 1e-6) return std::clamp((a - t) / (2 * a), 0.0, 1.0);
  return s / (2 * a) * (tail_integral((t - a) / s) - tail_integral((t + a) / s));
}

double student_tail(double t, double dof) {
  return boost::math::cdf(boost::math::complement(boost::math::students_t_distribution<double>(dof), t));
}

/// The point whose tail is `probability`, of a tail that falls: bisection on a bracket that is doubled until it holds it.
template <class Tail>
double reach(double probability, const Tail& tail) {
  double high = 1;
  while (tail(high) > probability && high < 1e9) high *= 2;
  double low = 0;
  for (int i = 0; i < 200 && high - low > 1e-15 * high; ++i) {
    const double middle = (low + high) / 2;
    (tail(middle) > probability ? low : high) = middle;
  }
  return (low + high) / 2;
}

/// Share of the variance that is rectangular when the factor of the two-sided `confidence` is k; 0 for a normal law.
double flat_share(double k, double confidence) {
  const double outside = (1 - confidence) / 2;
  const auto factor = [&](double flat) { return reach(outside, [flat](double t) { return flat_tail(t, flat); }); };
  // Within the accuracy of stated factors the rectangular law alone; a little below it the factor is not monotonic.
  if (k <= factor(1) * (1 + 2e-4)) return 1;
  double low = 0, high = 1;
  for (int i = 0; i < 50; ++i) {
    const double middle = (low + high) / 2;
    (factor(middle) > k ? low : high) = middle;
  }
  return (low + high) / 2;
}

/// Degrees of freedom whose t quantile is k; at least one.
double dof_of(double k, double confidence) {
  const double upto = (1 + confidence) / 2;
  if (k >= student_t_quantile(upto, 1)) return 1;
  double low = 0, high = std::log(kManyDof);
  for (int i = 0; i < 45; ++i) {
    const double middle = (low + high) / 2;
    (student_t_quantile(upto, std::exp(middle)) > k ? low : high) = middle;
  }
  return std::exp((low + high) / 2);
}

}  // namespace

std::optional<ValueLaw> ValueLaw::of(const Estimate& estimate) {
  const double value = estimate.quantity.value, u = estimate.quantity.standard_uncertainty;
  if (!std::isfinite(value)) return std::nullopt;
  const double down = value - estimate.low, up = estimate.high - value;
  const bool interval = down >= 0 && up >= 0 && std::isfinite(down);
  if (!interval) {
    if (!(u >= 0) || !std::isfinite(u)) return std::nullopt;
    return normal(value, u);
  }
  const double confidence = estimate.confidence, half = std::isfinite(up) ? std::max(down, up) : down;
  const double z = normal_quantile((1 + confidence) / 2);
  if (half == 0) return normal(value, u >= 0 ? u : 0);
  ValueLaw law;
  law.value_ = value;
  const double k = u > 0 ? half / u : z;
  double factor = z;  // of the family chosen: the interval is met exactly by scaling
  if (k < z * (1 - 1e-4)) {
    law.flat_ = flat_share(k, confidence);
    factor = reach((1 - confidence) / 2, [&](double t) { return flat_tail(t, law.flat_); });
  } else if (k > z * (1 + 1e-4)) {
    law.dof_ = dof_of(k, confidence);
    factor = student_t_quantile((1 + confidence) / 2, law.dof_);
  }
  law.u_down_ = down / factor;
  law.u_up_ = up / factor;
  law.u_ = u > 0 ? u : half / z;
  return law;
}

ValueLaw ValueLaw::normal(double value, double u) {
  ValueLaw law;
  law.value_ = value;
  law.u_ = law.u_down_ = law.u_up_ = u;
  return law;
}

ValueLaw ValueLaw::widened(double sigma) const {
  if (!(sigma > 0)) return *this;
  ValueLaw law = *this;
  law.u_ = std::hypot(u_, sigma);
  law.u_down_ = std::hypot(u_down_, sigma);
  law.u_up_ = std::hypot(u_up_, sigma);
  const double kept = u_ * u_ / (law.u_ * law.u_);  // share of the variance that was there before
  law.flat_ = flat_ * kept;
  if (dof_ > 0) law.dof_ = std::min(dof_ / (kept * kept), kManyDof);  // Welch-Satterthwaite (JCGM 100, G.4.1)
  return law;
}

ValueLaw ValueLaw::about(double value) const {
  ValueLaw law = *this;
  law.value_ = value;
  return law;
}

double ValueLaw::tail(double distance, double u) const {
  if (std::isinf(u)) return 0.5;
  if (u == 0) return 0;  // X is the value: neither below nor above it
  const double t = distance / u;
  if (dof_ > 0) return student_tail(t, dof_);
  return flat_tail(t, flat_);
}

double ValueLaw::tail_reach(double probability, double u) const {
  if (u == 0) return 0;
  if (std::isinf(u)) return std::numeric_limits<double>::infinity();
  if (dof_ > 0) return u * student_t_quantile(1 - probability, dof_);
  if (flat_ == 0) return -u * normal_quantile(probability);
  return u * reach(probability, [&](double t) { return flat_tail(t, flat_); });
}

double ValueLaw::below(double x) const { return x <= value_ ? tail(value_ - x, u_down_) : 1 - tail(x - value_, u_up_); }

double ValueLaw::above(double x) const { return x >= value_ ? tail(x - value_, u_up_) : 1 - tail(value_ - x, u_down_); }

double ValueLaw::inside(std::optional<double> min, std::optional<double> max) const {
  const double outside = (min ? below(*min) : 0) + (max ? above(*max) : 0);
  return std::clamp(1 - outside, 0.0, 1.0);
}

double ValueLaw::reach_down(double probability) const { return tail_reach(probability, u_down_); }
double ValueLaw::reach_up(double probability) const { return tail_reach(probability, u_up_); }

double ValueLaw::low() const { return value_ - reach_down(0.025); }
double ValueLaw::high() const { return value_ + reach_up(0.025); }
double ValueLaw::half_width() const { return std::max(value_ - low(), high() - value_); }

}  // namespace coilassay

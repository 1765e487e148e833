#include "fitting/statistics.h"

#include <algorithm>
#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/fisher_f.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <iterator>
#include <limits>
#include <numeric>
#include <vector>

namespace coilassay {
namespace {

namespace bm = boost::math;
namespace policy = boost::math::policies;

// Nothing is thrown: a value outside the domain is NaN, one beyond the range of a double is infinite.
using Quiet = policy::policy<policy::domain_error<policy::ignore_error>, policy::pole_error<policy::ignore_error>,
                             policy::overflow_error<policy::ignore_error>, policy::underflow_error<policy::ignore_error>,
                             policy::denorm_error<policy::ignore_error>, policy::rounding_error<policy::ignore_error>,
                             policy::evaluation_error<policy::ignore_error>,
                             policy::indeterminate_result_error<policy::ignore_error>>;

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr double kInfinity = std::numeric_limits<double>::infinity();
constexpr double kAsGoodAsInfinite = 1e12;  // degrees of freedom; the t law then is normal to 1e-12

bool is_probability(double p) { return p >= 0 && p <= 1; }

std::vector<double> without_nan(std::span<const double> values) {
  std::vector<double> kept;
  kept.reserve(values.size());
  std::copy_if(values.begin(), values.end(), std::back_inserter(kept), [](double v) { return !std::isnan(v); });
  return kept;
}

double median_of(std::vector<double>& values) {
  if (values.empty()) return kNan;
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  if (values.size() % 2 == 1) return *middle;
  return std::midpoint(*std::max_element(values.begin(), middle), *middle);
}

}  // namespace

double normal_quantile(double probability) {
  if (!is_probability(probability)) return kNan;
  if (probability == 0) return -kInfinity;
  if (probability == 1) return kInfinity;
  return bm::quantile(bm::normal_distribution<double, Quiet>(0, 1), probability);
}

double normal_cdf(double z) { return std::erfc(-z / std::sqrt(2.0)) / 2; }

double student_t_quantile(double probability, double dof) {
  if (!is_probability(probability) || !(dof > 0)) return kNan;
  if (dof > kAsGoodAsInfinite) return normal_quantile(probability);
  if (probability == 0) return -kInfinity;
  if (probability == 1) return kInfinity;
  return bm::quantile(bm::students_t_distribution<double, Quiet>(dof), probability);
}

double chi_square_quantile(double probability, double dof) {
  if (!is_probability(probability) || !(dof > 0)) return kNan;
  if (probability == 0) return 0;
  if (probability == 1 || std::isinf(dof)) return kInfinity;
  return bm::quantile(bm::chi_squared_distribution<double, Quiet>(dof), probability);
}

double f_upper_tail(double ratio, double dof_numerator, double dof_denominator) {
  if (std::isnan(ratio) || !(dof_numerator > 0) || !(dof_denominator > 0)) return kNan;
  if (ratio <= 0) return 1;
  if (std::isinf(ratio)) return 0;
  // Boost needs finite degrees of freedom; this many cannot be told from infinitely many.
  const double m = std::min(dof_numerator, kAsGoodAsInfinite);
  const double n = std::min(dof_denominator, kAsGoodAsInfinite);
  return bm::cdf(bm::complement(bm::fisher_f_distribution<double, Quiet>(m, n), ratio));
}

Summary summarise(std::span<const double> values) {
  Summary s{.count = 0, .mean = kNan, .standard_deviation = kNan, .min = kNan, .max = kNan};
  double sum = 0;
  for (const double v : values) {
    if (std::isnan(v)) continue;
    ++s.count;
    sum += v;
    s.min = std::fmin(s.min, v);
    s.max = std::fmax(s.max, v);
  }
  if (s.count == 0) return s;
  const double n = static_cast<double>(s.count);
  s.mean = sum / n;
  if (s.count < 2) return s;
  // Second pass about the mean: a small spread on a large offset keeps its digits. The sum of deviations corrects the
  // rounding of the mean itself.
  double deviations = 0, squares = 0;
  for (const double v : values) {
    if (std::isnan(v)) continue;
    deviations += v - s.mean;
    squares += (v - s.mean) * (v - s.mean);
  }
  s.standard_deviation = std::sqrt(std::max(0.0, squares - deviations * deviations / n) / (n - 1));
  s.mean += deviations / n;
  return s;
}

double median(std::span<const double> values) {
  std::vector<double> kept = without_nan(values);
  return median_of(kept);
}

double robust_deviation(std::span<const double> values) {
  std::vector<double> kept = without_nan(values);
  const double centre = median_of(kept);
  for (double& v : kept) v = std::abs(v - centre);
  // 1.4826 = 1 / normal_quantile(0.75): for normal values this is the standard deviation.
  return 1.482602218505602 * median_of(kept);
}

double lag_one_correlation(std::span<const double> residuals) {
  const double mean = summarise(residuals).mean;
  double products = 0, squares = 0;
  for (std::size_t i = 0; i < residuals.size(); ++i) {
    const double here = residuals[i] - mean;
    if (std::isnan(here)) continue;
    squares += here * here;
    if (i == 0) continue;
    const double before = residuals[i - 1] - mean;
    if (!std::isnan(before)) products += here * before;
  }
  return squares > 0 ? products / squares : 0;
}

double runs_test_z(std::span<const double> residuals) {
  double positive = 0, negative = 0, runs = 0;
  int last = 0;
  for (const double r : residuals) {
    if (std::isnan(r) || r == 0) continue;
    const int sign = r > 0 ? 1 : -1;
    (sign > 0 ? positive : negative) += 1;
    if (sign != last) runs += 1;
    last = sign;
  }
  const double n = positive + negative;
  if (n < 2) return 0;
  if (positive == 0 || negative == 0) return normal_quantile(std::exp2(std::max(1 - n, -1000.0)));
  const double mean = 1 + 2 * positive * negative / n;
  const double variance = (mean - 1) * (mean - 2) / (n - 1);
  return variance > 0 ? (runs - mean) / std::sqrt(variance) : 0;
}

}  // namespace coilassay

// Distributions and summaries that the rest of the program needs.
#pragma once

#include <cstddef>
#include <span>

namespace coilassay {

// Outside their domain (a probability outside [0, 1], degrees of freedom that are not positive) these give NaN; at the
// ends of the domain they give the limit, which may be infinite. An infinite number of degrees of freedom is allowed.
double normal_quantile(double probability);
double normal_cdf(double z);
double student_t_quantile(double probability, double dof);
double chi_square_quantile(double probability, double dof);
/// Upper tail of the F law: probability of a larger ratio by chance.
double f_upper_tail(double ratio, double dof_numerator, double dof_denominator);

/// Statistics of the values that are not NaN. With no value everything but `count` is NaN; with one value the standard
/// deviation is NaN, for it is not known.
struct Summary {
  std::size_t count = 0;
  double mean = 0;
  double standard_deviation = 0;  // n - 1
  double min = 0;
  double max = 0;
};
Summary summarise(std::span<const double> values);
/// Of the values that are not NaN; NaN when there is none.
double median(std::span<const double> values);
/// Standard deviation by the median absolute deviation (1.4826 MAD): outliers do not move it.
double robust_deviation(std::span<const double> values);
/// Lag-one correlation of residuals: near 0 when they are white. Pairs with a NaN are left out; 0 when nothing varies.
double lag_one_correlation(std::span<const double> residuals);
/// Wald-Wolfowitz runs test on signs: standard normal z, strongly negative when residuals hang together. Zeros and NaN
/// are left out. When all have one sign, z is that of the probability 2^(1-n) of such a row by chance.
double runs_test_z(std::span<const double> residuals);

}  // namespace coilassay

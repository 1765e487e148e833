#include "inspection/lot_statistics.h"

#include <algorithm>
#include <boost/math/distributions/beta.hpp>
#include <boost/math/distributions/binomial.hpp>
#include <boost/math/distributions/non_central_t.hpp>
#include <cmath>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

namespace bm = boost::math;

/// log of the number of ways to choose.
double log_choose(std::uint64_t n, std::uint64_t k) {
  const auto gamma = [](std::uint64_t m) { return std::lgamma(static_cast<double>(m) + 1); };
  return gamma(n) - gamma(k) - gamma(n - k);
}

/// Nonconforming units of a lot at which the claimed fraction no longer conforms: the least D with D/N > 1 - reliability.
std::uint64_t claim_broken_by(double reliability, std::uint64_t lot_size) {
  const double allowed = (1 - reliability) * static_cast<double>(lot_size);
  // 0.05 of 100 is 5 and not a rounding error less or more.
  return static_cast<std::uint64_t>(std::floor(allowed * (1 + 1e-12) + 1e-12)) + 1;
}

}  // namespace

double binomial_at_most(std::uint64_t c, std::uint64_t n, double fraction) {
  if (c >= n || fraction <= 0) return 1;
  if (fraction >= 1) return 0;
  return bm::cdf(bm::binomial_distribution<double>(static_cast<double>(n), fraction), static_cast<double>(c));
}

double hypergeometric_at_most(std::uint64_t c, std::uint64_t n, std::uint64_t nonconforming, std::uint64_t lot_size) {
  if (n > lot_size || nonconforming > lot_size) return std::nan("");
  const std::uint64_t conforming = lot_size - nonconforming;
  const std::uint64_t least = n > conforming ? n - conforming : 0;
  const std::uint64_t most = std::min({c, n, nonconforming});
  double sum = 0;
  for (std::uint64_t d = least; d <= most; ++d) {
    sum += std::exp(log_choose(nonconforming, d) + log_choose(conforming, n - d) - log_choose(lot_size, n));
  }
  return std::min(sum, 1.0);
}

double variables_acceptance(std::uint64_t n, double k, double fraction) {
  if (n < 2 || !(fraction >= 0) || fraction > 1) return std::nan("");
  if (fraction == 0) return 1;
  if (fraction == 1) return 0;
  const double count = static_cast<double>(n), root = std::sqrt(count);
  const bm::non_central_t_distribution<double> law(count - 1, root * normal_quantile(1 - fraction));
  return bm::cdf(bm::complement(law, k * root));
}

std::uint64_t claim_size(double confidence, double reliability) {
  // reliability^n <= 1 - confidence; a whole n is not missed by rounding.
  const double n = std::log1p(-confidence) / std::log(reliability);
  return static_cast<std::uint64_t>(std::max(1.0, std::ceil(n * (1 - 1e-12))));
}

std::uint64_t claim_size_of_lot(double confidence, double reliability, std::uint64_t lot_size) {
  const std::uint64_t bad = claim_broken_by(reliability, lot_size);
  if (bad > lot_size) return lot_size;
  // The probability of finding none falls with n: bisection.
  std::uint64_t low = 0, high = lot_size - bad + 1;  // with so many drawn one of them is bad for certain
  while (high - low > 1) {
    const std::uint64_t middle = low + (high - low) / 2;
    (hypergeometric_at_most(0, middle, bad, lot_size) <= (1 - confidence) * (1 + 1e-12) ? high : low) = middle;
  }
  return high;
}

double estimated_fraction_beyond(double index, std::uint64_t n) {
  if (n < 3) return std::nan("");
  const double count = static_cast<double>(n);
  const double x = 0.5 - index * std::sqrt(count) / (2 * (count - 1));
  if (x <= 0) return 0;
  if (x >= 1) return 1;
  return bm::cdf(bm::beta_distribution<double>(count / 2 - 1, count / 2 - 1), x);
}

}  // namespace coilassay

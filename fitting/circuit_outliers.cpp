#include "fitting/circuit_outliers.h"

#include <algorithm>
#include <cmath>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr std::size_t kNeighbours = 3;        // on either side
constexpr std::size_t kFewest = 16;           // of fewer points the circuit itself takes too much to judge one by the others
constexpr double kMedianVariance = 1.3;       // 1 and that of a median of six

std::vector<std::size_t> present(std::span<const std::complex<double>> residuals) {
  std::vector<std::size_t> list;
  for (std::size_t i = 0; i < residuals.size(); ++i) {
    if (!std::isnan(residuals[i].real())) list.push_back(i);
  }
  return list;
}

}  // namespace

double neighbour_noise(std::span<const std::complex<double>> residuals) {
  const auto list = present(residuals);
  if (list.size() < 8) return std::nan("");
  std::vector<double> differences;
  bool imaginary = false;
  for (std::size_t k = 0; k < list.size(); ++k) imaginary = imaginary || residuals[list[k]].imag() != 0;
  for (std::size_t k = 1; k < list.size(); ++k) {
    const std::complex<double> d = residuals[list[k]] - residuals[list[k - 1]];
    differences.push_back(std::fabs(d.real()));
    if (imaginary) differences.push_back(std::fabs(d.imag()));
  }
  return 1.4826 * median(differences) / std::sqrt(2.0);
}

double worst_by_chance(std::size_t n, double false_alarms, bool sigma_known) {
  const double count = static_cast<double>(n), odds = count / false_alarms;
  if (sigma_known) return 2 * std::log(odds);
  const double half = 0.15 * count;   // of the degrees of freedom; for two in the numerator the tail is (1 + x/half)^-half
  return 2 * half * (std::pow(odds, 1 / half) - 1);
}

std::vector<std::size_t> standing_out(std::span<const std::complex<double>> residuals, double sigma, bool sigma_known,
                                      double false_alarms) {
  const auto list = present(residuals);
  std::vector<std::size_t> out;
  const std::size_t n = list.size();
  if (n < kFewest) return out;
  const double limit = kMedianVariance * sigma * sigma * worst_by_chance(n, false_alarms, sigma_known);
  std::vector<double> real, imaginary;
  for (std::size_t k = 0; k < n; ++k) {
    // At an end the window moves inward: six neighbours everywhere.
    const std::size_t first = std::min(k - std::min(k, kNeighbours), n - 2 * kNeighbours - 1);
    real.clear();
    imaginary.clear();
    for (std::size_t m = first; m <= first + 2 * kNeighbours; ++m) {
      if (m == k) continue;
      real.push_back(residuals[list[m]].real());
      imaginary.push_back(residuals[list[m]].imag());
    }
    const std::complex<double> off = residuals[list[k]] - std::complex<double>(median(real), median(imaginary));
    if (std::norm(off) > limit && std::norm(residuals[list[k]]) > limit / kMedianVariance) out.push_back(list[k]);
  }
  return out;
}

}  // namespace coilassay

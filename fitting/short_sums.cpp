#include "fitting/short_sums.h"

#include <cassert>
#include <cmath>
#include <complex>

namespace coilassay {

bool ShortSums::complete(std::span<const double> y) {
  const std::size_t count = y.size() / length, known = sum.size();
  if (known < count) {
    const BlockSums rest = block_sums(y.subspan(known * length), length, count - known, 0, reference);
    sum.insert(sum.end(), rest.sum.begin(), rest.sum.end());
    square.insert(square.end(), rest.square.begin(), rest.square.end());
  }
  for (const double s : sum) {
    if (!std::isfinite(s)) return false;
  }
  return true;
}

BlockSums block_sums(const ShortSums& sums, std::size_t length, std::size_t count, double omega) {
  const std::size_t each = length / sums.length;
  assert(each * sums.length == length && each * count <= sums.sum.size());
  BlockSums result{.length = length,
                   .omega = omega,
                   .reference = sums.reference,
                   .sum = std::vector<double>(count),
                   .square = std::vector<double>(count),
                   .demodulated = {}};
  std::vector<std::complex<double>> phase;
  if (omega != 0) {
    result.demodulated.resize(count);
    for (std::size_t j = 0; j < each; ++j) {
      phase.push_back(std::polar(1.0, -omega * static_cast<double>(j * sums.length)));
    }
  }
  for (std::size_t k = 0; k < count; ++k) {
    for (std::size_t j = 0; j < each; ++j) {
      result.sum[k] += sums.sum[k * each + j];
      result.square[k] += sums.square[k * each + j];
      if (omega != 0) result.demodulated[k] += sums.sum[k * each + j] * phase[j];
    }
  }
  return result;
}

}  // namespace coilassay

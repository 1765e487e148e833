#include "fitting/extremes.h"

#include <algorithm>
#include <array>
#include <limits>

namespace coilassay {

Extremes extremes(std::span<const double> values) {
  // Eight chains of their own, so that no comparison waits for the one before; a comparison with NaN is false.
  constexpr std::size_t kChains = 8;
  std::array<double, kChains> low, high;
  low.fill(std::numeric_limits<double>::infinity());
  high.fill(-std::numeric_limits<double>::infinity());
  std::size_t i = 0;
  for (; i + kChains <= values.size(); i += kChains) {
    for (std::size_t k = 0; k < kChains; ++k) {
      const double v = values[i + k];
      low[k] = v < low[k] ? v : low[k];
      high[k] = v > high[k] ? v : high[k];
    }
  }
  for (; i < values.size(); ++i) {
    low[0] = values[i] < low[0] ? values[i] : low[0];
    high[0] = values[i] > high[0] ? values[i] : high[0];
  }
  return {*std::min_element(low.begin(), low.end()), *std::max_element(high.begin(), high.end())};
}

}  // namespace coilassay

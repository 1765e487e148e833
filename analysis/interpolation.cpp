#include "analysis/interpolation.h"

#include <algorithm>
#include <cassert>

namespace coilassay {

namespace {
constexpr double kRounding = 1e-6;   // of a frequency: files write them with some digits
}

GridPlace place_in_grid(std::span<const double> grid, double frequency) {
  assert(grid.size() >= 2);
  GridPlace place;
  const auto above = static_cast<std::size_t>(std::upper_bound(grid.begin(), grid.end(), frequency) - grid.begin());
  const std::size_t left = std::clamp<std::size_t>(above, 1, grid.size() - 1) - 1;   // grid[left] .. grid[left + 1]
  place.count = std::min<std::size_t>(4, grid.size());
  place.first = std::min(left == 0 ? 0 : left - 1, grid.size() - place.count);
  for (std::size_t a = 0; a < place.count; ++a) {
    double weight = 1;
    for (std::size_t b = 0; b < place.count; ++b) {
      const double other = grid[place.first + b];
      if (a != b) weight *= (frequency - other) / (grid[place.first + a] - other);
    }
    place.cubic[a] = weight;
  }
  const double share = (frequency - grid[left]) / (grid[left + 1] - grid[left]);
  place.linear[left - place.first] = 1 - share;
  place.linear[left - place.first + 1] = share;
  return place;
}

std::complex<double> at_place(std::span<const std::complex<double>> values, const GridPlace& place, bool linear) {
  std::complex<double> sum = 0;
  for (std::size_t k = 0; k < place.count; ++k) sum += (linear ? place.linear[k] : place.cubic[k]) * values[place.first + k];
  return sum;
}

bool covers(std::span<const double> grid, double low, double high) {
  return grid.size() >= 2 && low >= grid.front() * (1 - kRounding) && high <= grid.back() * (1 + kRounding);
}

}  // namespace coilassay
